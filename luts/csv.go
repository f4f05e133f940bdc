package luts

import (
	"bytes"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// WriteCSV writes a table as lines: "# kind:", "# in_bits:", "# out_bits:" and "# provenance:" with a line of
// JSON, the header "input,output", then one row per input, the least first.
func WriteCSV(w io.Writer, t Table, p Provenance) error {
	if err := t.Check(); err != nil {
		return err
	}
	line, err := marshalProvenance(p)
	if err != nil {
		return err
	}
	var b bytes.Buffer
	fmt.Fprintf(&b, "# kind: %s\n# in_bits: %d\n# out_bits: %d\n# provenance: %s\ninput,output\n", t.Kind, t.InBits, t.OutBits, line)
	for i, e := range t.Entries {
		fmt.Fprintf(&b, "%d,%d\n", t.First+i, e)
	}
	return write(w, b.Bytes())
}

// ReadCSV reads what WriteCSV writes; "# provenance:" may be left out. A spreadsheet may have put semicolons or tabs
// for the commas, blank lines, CRLF or a byte-order mark. Other "#" lines are comments. Rows must be all there and
// in order. The error is a *FormatError with the file's name as given.
func ReadCSV(file string, r io.Reader) (Table, Provenance, error) {
	text, err := readText(file, r)
	if err != nil {
		return Table{}, nil, err
	}
	c := csvReader{seen: map[string]bool{}}
	number := 0
	for line := range strings.Lines(string(text)) {
		number++
		if f := c.line(strings.TrimSpace(line)); f != nil {
			return Table{}, nil, f.at(file, number)
		}
	}
	if c.separator == "" {
		return Table{}, nil, newFlaw("choose the file of a table", "no header").wants("input,output").at(file, 0)
	}
	if f := c.table.flaw(); f != nil {
		return Table{}, nil, f.at(file, 0)
	}
	return c.table, c.provenance, nil
}

type csvReader struct {
	seen       map[string]bool // names of "# name:" lines
	separator  string          // "" before the header
	table      Table
	provenance Provenance
}

func (c *csvReader) line(line string) *flaw {
	comment, ok := strings.CutPrefix(line, "#")
	switch {
	case line == "":
		return nil
	case ok:
		name, value, _ := strings.Cut(comment, ":")
		return c.meta(strings.TrimSpace(name), strings.TrimSpace(value))
	case c.separator == "":
		return c.header(line)
	}
	return c.row(line)
}

func (c *csvReader) meta(name, value string) *flaw {
	switch name {
	case "kind", "in_bits", "out_bits", "provenance":
	default:
		return nil
	}
	if c.separator != "" {
		return newFlaw("move it up", "%s below the header", name).wants("it above")
	}
	if c.seen[name] {
		return newFlaw("keep one of them", "%s twice", name).wants("it once")
	}
	c.seen[name] = true
	var f *flaw
	switch name {
	case "kind":
		if c.table.Kind = Kind(value); c.table.Kind != Calibration && c.table.Kind != Window {
			return newFlaw("say what the table is for", "%s as kind", quote(value)).wants("%s or %s", Calibration, Window)
		}
	case "in_bits":
		c.table.InBits, f = bitsOf(name, value)
	case "out_bits":
		c.table.OutBits, f = bitsOf(name, value)
	case "provenance":
		c.provenance, f = unmarshalProvenance([]byte(value))
	}
	return f
}

func bitsOf(name, value string) (int, *flaw) {
	n, err := strconv.Atoi(value)
	if err != nil || n < 1 || n > 16 {
		return 0, newFlaw("correct the number", "%s as %s", quote(value), name).wants("an integer from 1 to 16")
	}
	return n, nil
}

func (c *csvReader) header(line string) *flaw {
	for _, separator := range []string{",", ";", "\t"} {
		input, output, ok := strings.Cut(line, separator)
		if ok && strings.TrimSpace(input) == "input" && strings.TrimSpace(output) == "output" {
			c.separator = separator
		}
	}
	if c.separator == "" {
		return newFlaw("choose the file of a table or add the header", "%s as header", quote(line)).wants("input,output")
	}
	for _, name := range []string{"kind", "in_bits", "out_bits"} {
		if !c.seen[name] {
			return newFlaw("add the line", "no line \"# %s:\" above the header", name).wants("# kind:, # in_bits: and # out_bits:")
		}
	}
	return nil
}

func (c *csvReader) row(line string) *flaw {
	t := &c.table
	in, out, ok := strings.Cut(line, c.separator)
	if !ok {
		return newFlaw("correct the row", "%s", quote(line)).wants("an input and an output")
	}
	input, err := strconv.Atoi(strings.TrimSpace(in))
	if err != nil {
		return newFlaw("correct the row", "%s as input", quote(in)).wants("an integer")
	}
	output, err := strconv.Atoi(strings.TrimSpace(out))
	if err != nil || output < 0 || output > top(t.OutBits) {
		return newFlaw("correct the row", "%s as output", quote(out)).wants("an integer from 0 to %d", top(t.OutBits))
	}
	switch n := len(t.Entries); {
	case n == 1<<t.InBits:
		return newFlaw("remove the row or correct in_bits", "a row for input %d", input).wants("no more than %d rows for %d bits", n, t.InBits)
	case n == 0 && (input == 0 || input == -1<<(t.InBits-1)):
		t.First = input
	case n == 0:
		return newFlaw("add the rows before", "input %d in the first row", input).wants("0, or %d for signed data", -1<<(t.InBits-1))
	case input != t.First+n:
		return newFlaw("put all rows in order", "input %d", input).wants("%d", t.First+n)
	}
	t.Entries = append(t.Entries, uint16(output))
	return nil
}
