package gsdf

import (
	"encoding/csv"
	"errors"
	"io"
	"math"
	"os"
	"strconv"
	"testing"

	"evenstep/display/photometry"
)

// mustLuminance and mustIndex serve the tests whose argument lies within the range.
func mustLuminance(tb testing.TB, j JND) photometry.CdM2 {
	tb.Helper()
	l, err := Luminance(j)
	if err != nil {
		tb.Fatal(err)
	}
	return l
}

func mustIndex(tb testing.TB, l photometry.CdM2) JND {
	tb.Helper()
	j, err := Index(l)
	if err != nil {
		tb.Fatal(err)
	}
	return j
}

// polynomial is the inverse that PS3.14 section 7.1 prints in a note. The package does not use it;
// the benchmark and the tests compare with it.
func polynomial(l float64) float64 {
	const (
		a = 71.498068
		b = 94.593053
		c = 41.912053
		d = 9.8247004
		e = 0.28175407
		f = -1.1878455
		g = -0.18014349
		h = 0.14710899
		i = -0.017046845
	)
	y := math.Log10(l)
	return a + y*(b+y*(c+y*(d+y*(e+y*(f+y*(g+y*(h+y*i)))))))
}

// TestTableB1 compares with PS3.14 Annex B, Table B-1, every row. The table was worked out with
// more digits than the standard prints for its equation, hence the tolerance: half a unit of the
// fourth decimal, or 2.2e-5 of the luminance where that is more.
func TestTableB1(t *testing.T) {
	file, err := os.Open("testdata/table-b1.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows := csv.NewReader(file)
	rows.Comment = '#'
	if _, err := rows.Read(); err != nil {
		t.Fatal(err)
	}
	count := 0
	for {
		row, err := rows.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		count++
		j, err := strconv.Atoi(row[0])
		if err != nil {
			t.Fatal(err)
		}
		want, err := strconv.ParseFloat(row[1], 64)
		if err != nil {
			t.Fatal(err)
		}
		if j != count {
			t.Fatalf("row %d holds index %d", count, j)
		}
		got := float64(mustLuminance(t, JND(j)))
		if tolerance := max(5e-5, 2.2e-5*want); math.Abs(got-want) > tolerance {
			t.Errorf("L(%d) = %.6f, table B-1 prints %.4f, tolerance %.6f", j, got, want, tolerance)
		}
	}
	if count != int(Last) {
		t.Errorf("table B-1 has %d rows here, want %v", count, Last)
	}
}

// TestLuminanceInDoublePrecision checks the digits that the printed coefficients give.
func TestLuminanceInDoublePrecision(t *testing.T) {
	// The tolerance is half a unit of the last digit quoted, or a little more.
	rows := []struct {
		name      string
		j         JND
		want      float64
		tolerance float64
	}{
		// PS3.14 section 7.1, printed coefficients, evaluated by a second program.
		{"first", 1, 0.04998184691, 6e-12},
		{"second", 2, 0.05467866430, 6e-12},
		{"fifth", 5, 0.06955310088, 6e-12},
		{"113", 113, 2.354249190, 6e-10},
		{"256", 256, 15.23831463, 6e-9},
		{"700", 700, 480.4998947, 6e-8},
		{"1000", 1000, 3439.158978, 6e-7},
		// Documentation of an open colour-science library.
		{"512", 512, 130.0652840, 6e-8},
		// A reference profile of the International Color Consortium.
		{"last", 1023, 3993.32958588733, 6e-11},
		// Unit tests of an open colour-science library, 2024 tree: index over 1023 to luminance.
		{"library, dark", 0.001007281350787 * 1023, 0.050143440671692, 1e-14},
		{"library, middle", 0.500486263438448 * 1023, 130.06286470647655, 1e-10},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			if got := float64(mustLuminance(t, row.j)); math.Abs(got-row.want) > row.tolerance {
				t.Errorf("Luminance(%v) = %.14g, want %.14g within %g", row.j, got, row.want, row.tolerance)
			}
		})
	}
}

// TestIndexAgainstPrintedInverse compares with values that others worked out by the printed
// polynomial. It is no exact inverse of the printed equation: 0.092 JND covers the difference of
// the two over the whole range.
func TestIndexAgainstPrintedInverse(t *testing.T) {
	const tolerance = 0.092
	rows := []struct {
		name string
		l    photometry.CdM2
		want float64
	}{
		// Unit tests of an open colour-science library, 2024 tree: luminance to index over 1023.
		{"library, dark", 0.05, 0.001007281350787 * 1023},
		{"library, middle", 130.0662, 0.500486263438448 * 1023},
		// PS3.14 Annex D.1, smallest and largest index of the example monitor.
		{"annex D.1 dark", 0.305, 32.54},
		{"annex D.1 bright", 84.34, 453.85},
		// PS3.14 Annex D.2, smallest index of the example film. The largest, 848.75, is a
		// misprint: both functions give 847.2.
		{"annex D.2 dark", 12.0, 233.32},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			if got := float64(mustIndex(t, row.l)); math.Abs(got-row.want) > tolerance {
				t.Errorf("Index(%v) = %.5f, want %.5f within %g", row.l, got, row.want, tolerance)
			}
		})
	}
	t.Run("library, beyond the last index", func(t *testing.T) {
		// The library answers 1.000160314715578 times 1023 for 4000 cd/m2; here that is an error.
		if j, err := Index(4000); !errors.Is(err, ErrAbove) {
			t.Errorf("Index(4000) = %v, %v, want ErrAbove", j, err)
		}
		if l, err := Luminance(1.000160314715578 * 1023); !errors.Is(err, ErrAbove) {
			t.Errorf("Luminance(1023.16) = %v, %v, want ErrAbove", l, err)
		}
	})
}

// TestPrintedFunctionsDiffer holds the figures that the package comment states, and guards the
// copy of the polynomial that the benchmark runs: the colour library's three values are its own.
func TestPrintedFunctionsDiffer(t *testing.T) {
	for l, want := range map[float64]float64{0.05: 0.001007281350787, 130.0662: 0.500486263438448, 4000: 1.000160314715578} {
		if got := polynomial(l) / 1023; math.Abs(got-want) > 1e-14 {
			t.Errorf("polynomial(%v)/1023 = %.15f, the library has %.15f", l, got, want)
		}
	}
	var lowest, highest float64
	var lowestAt, highestAt JND
	for j := First; j <= Last; j++ {
		d := polynomial(float64(mustLuminance(t, j))) - float64(j)
		if d < lowest {
			lowest, lowestAt = d, j
		}
		if d > highest {
			highest, highestAt = d, j
		}
	}
	if math.Abs(lowest+0.0916) > 5e-4 || lowestAt != 1023 || math.Abs(highest-0.0506) > 5e-4 || highestAt != 2 {
		t.Errorf("polynomial errs from %.4f at %v to %.4f at %v, want -0.0916 at 1023 and +0.0506 at 2",
			lowest, lowestAt, highest, highestAt)
	}
}
