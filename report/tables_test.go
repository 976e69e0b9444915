package report

import (
	"bytes"
	"testing"
)

func TestTablesAreSound(t *testing.T) {
	rs := everything()
	for name, tab := range tablesOf(rs) {
		if err := tab.Check(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		var b bytes.Buffer
		if err := tab.WriteECSV(&b); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}
