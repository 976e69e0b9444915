package report

import (
	"encoding/json"
	"fmt"
	"io"
)

// JSON writes v indented, one document, with nothing escaped for HTML. Numbers
// have every digit. What cannot stand in JSON (NaN, an infinity) is an error;
// budget.Number leaves such parts out by itself.
func JSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(v); err != nil {
		return fmt.Errorf("writing JSON: %w", err)
	}
	return nil
}
