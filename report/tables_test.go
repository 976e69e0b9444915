package report

import (
	"bytes"
	"math"
	"strconv"
	"strings"
	"testing"

	"lacuna/budget"
	"lacuna/internal/table"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// Every table is sound, also of records that hold nothing, and reads back as it
// was written.
func TestTablesReadBack(t *testing.T) {
	for _, rs := range [][]survey.Record{everything(), hard(), nil} {
		for name, tab := range tablesOf(rs) {
			if err := tab.Check(); err != nil {
				t.Errorf("%s: %v", name, err)
			}
			var b bytes.Buffer
			if err := tab.WriteECSV(&b); err != nil {
				t.Fatalf("%s: %v", name, err)
			}
			back, err := table.ReadECSV(bytes.NewReader(b.Bytes()), name)
			if err != nil {
				t.Fatalf("%s: %v", name, err)
			}
			if back.Rows() != tab.Rows() || len(back.Cols) != len(tab.Cols) {
				t.Fatalf("%s: %d × %d came back as %d × %d", name, tab.Rows(), len(tab.Cols), back.Rows(), len(back.Cols))
			}
			for i, c := range tab.Cols {
				for j, cell := range c.Cells {
					if got := back.Cols[i].Cells[j]; got != cell {
						t.Errorf("%s, %s, row %d: %+v came back as %+v", name, c.Name, j+1, cell, got)
					}
				}
				if c.Description == "" {
					t.Errorf("%s: column %s says nothing about itself", name, c.Name)
				}
			}
		}
	}
}

// column finds a column by name.
func column(t *testing.T, tab *table.Table, name string) []table.Cell {
	t.Helper()
	for _, c := range tab.Cols {
		if c.Name == name {
			return c.Cells
		}
	}
	t.Fatalf("no column %s", name)
	return nil
}

// A line that is not detected has its limit as W_mA, without an error, and its
// measurement beside it; a detected one has its value and no limit.
func TestWidthsTableLimits(t *testing.T) {
	rs := everything()
	tab := Widths(rs)
	kind, w, e := column(t, tab, "W_kind"), column(t, tab, "W_mA"), column(t, tab, "W_err_mA")
	meas, measErr, limit := column(t, tab, "W_meas_mA"), column(t, tab, "W_meas_err_mA"), column(t, tab, "W_limit_mA")
	i, upper := 0, 0
	for _, r := range rs {
		for _, x := range r.Result.Widths {
			near := func(c table.Cell, want, tol float64) {
				t.Helper()
				got, err := strconv.ParseFloat(c.Text, 64)
				if err != nil || !(math.Abs(got-want) <= tol) {
					t.Errorf("%s: %q, want %v", x.Line, c.Text, want)
				}
			}
			near(meas[i], x.W.X*1000, 5e-3*x.W.Err()*1000) // two digits beyond the rule: within 0.5 % of the error
			near(measErr[i], x.W.Err()*1000, 5e-3*x.W.Err()*1000)
			if x.Detected {
				if kind[i].Text != "value" || w[i] != meas[i] || e[i] != measErr[i] || limit[i].Set {
					t.Errorf("%s: %s %v %v, limit %v", x.Line, kind[i].Text, w[i], e[i], limit[i])
				}
			} else {
				upper++
				if kind[i].Text != "upper" || w[i] != limit[i] || e[i].Set {
					t.Errorf("%s: %s %v %v, limit %v", x.Line, kind[i].Text, w[i], e[i], limit[i])
				}
				near(limit[i], x.Limit*1000, 0.01)
				if got, _ := strconv.ParseFloat(limit[i].Text, 64); got < x.Limit*1000 {
					t.Errorf("%s: limit %v printed below itself", x.Line, x.Limit*1000)
				}
			}
			i++
		}
	}
	if upper == 0 {
		t.Error("the fixture has no limit")
	}
}

func TestMarginalWidth(t *testing.T) {
	r := lantern1()
	w := &r.Result.Widths[4]
	w.Flag |= budget.Marginal
	tab := Widths([]survey.Record{r})
	if k, x := column(t, tab, "W_kind")[4], column(t, tab, "W_mA")[4]; k.Text != "marginal" || x != column(t, tab, "W_meas_mA")[4] {
		t.Errorf("%v %v", k, x)
	}
	if got, want := figureWidth(*w), "W "+printWidth(*w).marked()+" mÅ (marginal)"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	var b bytes.Buffer
	if err := Summary(&b, []survey.Record{r}, Options{}); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(b.String(), "< 9.5 mÅ; 3σ limit") || strings.Contains(b.String(), "K I 7698.96    < 9.5") { // the fixture's limit
		t.Errorf("a marginal width in the summary:\n%s", b.String())
	}
}

// The velocity column is named by its frame, and by none where frames differ.
func TestVelocityColumn(t *testing.T) {
	for _, tc := range []struct {
		kinds []frame.Kind
		want  string
	}{
		{[]frame.Kind{frame.Heliocent}, "v_helio"}, {[]frame.Kind{frame.Barycentric, frame.Barycentric}, "v_bary"},
		{[]frame.Kind{frame.LSRK}, "v_lsr"}, {[]frame.Kind{frame.Heliocent, frame.Barycentric}, "v"}, {nil, "v"},
	} {
		var rs []survey.Record
		for _, k := range tc.kinds {
			rs = append(rs, survey.Record{Status: "done", Result: survey.Result{Frame: k}})
		}
		rs = append(rs, survey.Record{Status: "failed"})
		if got, _ := velocityColumn(rs); got != tc.want {
			t.Errorf("%v: %s, want %s", tc.kinds, got, tc.want)
		}
	}
}

// One row a species is adopted, refused depletions have a reason and no number.
func TestColumnsAndDepletionsTables(t *testing.T) {
	rs := everything()
	adopted := 0
	for _, c := range column(t, Columns(rs), "adopted") {
		if c.Text == "true" {
			adopted++
		}
	}
	if want := len(rs[0].Result.Adopted) + len(rs[1].Result.Adopted); adopted != want {
		t.Errorf("%d adopted rows, want %d", adopted, want)
	}
	tab := Depletions(rs)
	d, why := column(t, tab, "D"), column(t, tab, "refused")
	refused := 0
	for i := range d {
		if d[i].Set == why[i].Set {
			t.Errorf("row %d: D %v, refused %v", i+1, d[i], why[i])
		}
		if why[i].Set {
			refused++
		}
	}
	if refused != 3 {
		t.Errorf("%d refused, want 3", refused)
	}
}

// errorDecimals follows the 355/950 rule also far from 1.
func TestErrorDecimals(t *testing.T) {
	for _, tc := range []struct {
		err  float64
		want int
	}{{0.0147, 3}, {0.0371, 2}, {0.0962, 2}, {0.118, 2}, {14.4, 0}, {355, 0}, {3.2e-7, 8}, {4e-12, 12}} {
		if got := errorDecimals(tc.err, tc.err); got != tc.want {
			t.Errorf("errorDecimals(%v) = %d, want %d", tc.err, got, tc.want)
		}
	}
}

// The source of an f-value comes from the record's own list of rows used.
func TestSourceOfF(t *testing.T) {
	tab := Widths([]survey.Record{lantern1()})
	if src, st := column(t, tab, "f_source")[0], column(t, tab, "f_status")[0]; src.Text != "AuthorA2001" || st.Text != "verified" {
		t.Errorf("%v, %v", src, st)
	}
	if src := column(t, tab, "f_source")[1]; src.Set {
		t.Errorf("a source for a line without one: %v", src)
	}
}
