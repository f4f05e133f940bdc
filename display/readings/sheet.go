package readings

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"
)

// What one file may hold. A file beyond any of these is not a file of readings.
const (
	// maxFile holds the longest series, 65536 levels of 16 bits with time and role in each row.
	maxFile = 4 << 20
	// maxLine holds any row with room for long comments; no cell takes more than 40 characters.
	maxLine = 4096
	// maxRows holds every level of 16 bits once, and some thousand repeats.
	maxRows = 70_000
	// maxText holds any serial number or name of a meter. In characters.
	maxText = 200
)

// text is one line of a file without its end.
type text struct {
	line int
	s    string
}

// row is one line of cells, as many as the header has.
type row struct {
	line  int
	cells []string
}

// sheet is a file cut into lines and cells, before any of them mean something.
type sheet struct {
	name     string
	sha256   string
	delim    byte
	comments []text // those with a colon, without the leading "#"
	rows     []row
	at       map[string]int    // kind of column to index
	heading  map[string]string // kind of column to its name in the file, lower case
}

// heading is a name that a column may have, and what a column of that name gives.
type heading struct{ name, kind string }

func (s *sheet) fail(line int, found, expected, do string) error {
	return &FormatError{File: s.name, Line: line, Found: found, Expected: expected, Do: do}
}

// readSheet reads a whole file, finds its header and cuts its rows. Columns are those of headings;
// the kinds in required must be there.
func readSheet(name string, r io.Reader, headings []heading, required ...string) (*sheet, error) {
	s := &sheet{name: name}
	data, err := io.ReadAll(io.LimitReader(r, maxFile+1))
	if err != nil {
		return nil, &FormatError{
			File: name, Found: "reading stopped (" + shorten(err.Error()) + ")",
			Expected: "a file that can be read to its end", Do: "check the file and the disk it is on", cause: err,
		}
	}
	if err := s.checkBytes(data); err != nil {
		return nil, err
	}
	sum := sha256.Sum256(data)
	s.sha256 = hex.EncodeToString(sum[:])

	lines, err := s.lines(string(bytes.TrimPrefix(data, []byte("\xef\xbb\xbf"))))
	if err != nil {
		return nil, err
	}
	content := lines[:0]
	for _, l := range lines {
		comment, ok := strings.CutPrefix(strings.TrimLeft(l.s, " \t"), "#")
		switch {
		case !ok:
			content = append(content, l)
		case strings.Contains(comment, ":"):
			s.comments = append(s.comments, text{l.line, comment})
		}
	}
	if len(content) == 0 {
		return nil, s.fail(0, "no header row", "a row of column names such as "+example(headings), "give the columns names in the first row")
	}
	if err := s.header(content[0], headings, required); err != nil {
		return nil, err
	}
	return s, s.cut(content[0], content[1:])
}

// checkBytes refuses what is no text file at all, with the reason that the user is likely to know.
func (s *sheet) checkBytes(data []byte) error {
	const expected, do = "CSV text in UTF-8", "save the file as CSV, UTF-8"
	switch {
	case len(data) == 0:
		return s.fail(0, "an empty file", expected, "save the readings again")
	case len(data) > maxFile:
		return s.fail(0, "a file of more than 4 MiB", "at most 4 MiB, which holds every level of 16 bits", "check that this is a file of readings")
	case bytes.HasPrefix(data, []byte("\xff\xfe")) || bytes.HasPrefix(data, []byte("\xfe\xff")):
		return s.fail(0, "text in UTF-16", expected, do)
	case bytes.HasPrefix(data, []byte("PK\x03\x04")):
		return s.fail(0, "a workbook or an archive", expected, do)
	}
	if i := bytes.IndexByte(data, 0); i >= 0 {
		return s.fail(lineOf(data[:i]), "a zero byte", expected, do)
	}
	return nil
}

// lineOf is the number of the line that follows data.
func lineOf(data []byte) int {
	ends := bytes.Count(data, []byte("\n")) + bytes.Count(data, []byte("\r")) - bytes.Count(data, []byte("\r\n"))
	return ends + 1
}

// lines cuts at LF, CRLF or CR alone and leaves blank lines out.
func (s *sheet) lines(data string) ([]text, error) {
	var lines []text
	for n := 1; data != ""; n++ {
		l := data
		if i := strings.IndexAny(data, "\r\n"); i < 0 {
			data = ""
		} else {
			l, data = data[:i], strings.TrimPrefix(strings.TrimPrefix(data[i:], "\r"), "\n")
		}
		switch {
		case len(l) > maxLine:
			return nil, s.fail(n, fmt.Sprintf("a line of %d bytes", len(l)), fmt.Sprintf("at most %d", maxLine), "check that this is a file of readings, one to a line")
		case !utf8.ValidString(l):
			return nil, s.fail(n, "text that is not UTF-8", "CSV text in UTF-8", "save the file as CSV, UTF-8")
		case strings.TrimSpace(l) != "":
			lines = append(lines, text{n, l})
		}
	}
	return lines, nil
}

// header finds the delimiter and the columns.
func (s *sheet) header(h text, headings []heading, required []string) error {
	s.delim = delimiter(h.s)
	names, problem := split(h.s, s.delim)
	if problem != "" {
		return s.badQuote(h.line, problem)
	}
	if looksLikeRow(names) {
		return s.fail(h.line, "a row of numbers "+quote(h.s), "a header row such as "+example(headings), "add the header row above the first reading")
	}
	known := make([]string, len(headings))
	for i, c := range headings {
		known[i] = c.name
	}
	s.at, s.heading = map[string]int{}, map[string]string{}
	for i, n := range names {
		if n == "" {
			continue
		}
		k := slices.Index(known, strings.ToLower(n))
		if k < 0 {
			do := "delete the column or rename it"
			if near := nearest(n, known); near != "" {
				do = "did you mean " + quote(near) + "? Rename or delete the column"
			}
			return s.fail(h.line, "unknown column "+quote(n), "columns out of "+strings.Join(known, ", "), do)
		}
		kind := headings[k].kind
		if other, twice := s.heading[kind]; twice {
			return s.fail(h.line, fmt.Sprintf("columns %s and %s", quote(other), quote(known[k])), "one column for the "+kind, "delete one of them")
		}
		s.at[kind], s.heading[kind] = i, known[k]
	}
	for _, kind := range required {
		if _, ok := s.at[kind]; !ok {
			var names []string
			for _, c := range headings {
				if c.kind == kind {
					names = append(names, c.name)
				}
			}
			return s.fail(h.line, "no column for the "+kind, "a column named "+strings.Join(names, " or "), "add or rename the column")
		}
	}
	return nil
}

// cut makes rows of the lines below the header.
func (s *sheet) cut(h text, lines []text) error {
	if len(lines) > maxRows {
		return s.fail(lines[maxRows].line, fmt.Sprintf("more than %d rows", maxRows), "at most that many, every level of 16 bits and some repeats", "split the file")
	}
	names, _ := split(h.s, s.delim)
	for _, l := range lines {
		cells, problem := split(l.s, s.delim)
		if problem != "" {
			return s.badQuote(l.line, problem)
		}
		if !slices.ContainsFunc(cells, func(c string) bool { return c != "" }) {
			continue // spreadsheets leave rows of delimiters behind
		}
		if len(cells) != len(names) {
			do := "separate cells with the " + delimiterName(s.delim) + " of the header row and leave no cell out"
			if len(cells) > len(names) && s.delim == ',' {
				do = "write decimals with a point and no thousands marks, or separate the columns with semicolons"
			}
			return s.fail(l.line, fmt.Sprintf("%s in %s", count(len(cells), "cell"), quote(l.s)), fmt.Sprintf("%d as in the header row", len(names)), do)
		}
		for i, c := range cells {
			if names[i] == "" && c != "" {
				return s.fail(l.line, fmt.Sprintf("%s in column %d, which has no name", quote(c), i+1), "an empty cell", "name the column in the header row or delete it")
			}
		}
		s.rows = append(s.rows, row{l.line, cells})
	}
	if len(s.rows) == 0 {
		return s.fail(0, "no row below the header", "one row for each reading", "add the readings")
	}
	return nil
}

// cell is the cell of a kind, "" where the file has no such column.
func (s *sheet) cell(r row, kind string) string {
	if i, ok := s.at[kind]; ok {
		return r.cells[i]
	}
	return ""
}

func (s *sheet) badQuote(line int, problem string) error {
	return s.fail(line, problem, `cells as they are or wholly in double quotes, such as "0.64"`, "close the quote or delete it")
}

// delimiter is what stands most often in a header row, outside quotes, of tab, semicolon and comma.
func delimiter(header string) byte {
	var bare strings.Builder
	for i, part := range strings.Split(header, `"`) {
		if i%2 == 0 {
			bare.WriteString(part)
		}
	}
	best, most := byte(','), 0
	for _, d := range []byte("\t;,") {
		if n := strings.Count(bare.String(), string(d)); n > most {
			best, most = d, n
		}
	}
	return best
}

func delimiterName(d byte) string {
	switch d {
	case '\t':
		return "tab"
	case ';':
		return "semicolon"
	}
	return "comma"
}

// split cuts a line into trimmed cells. A cell in double quotes may hold the delimiter, and a double
// quote written twice, but no end of line.
func split(s string, delim byte) (cells []string, problem string) {
	blank := " \t"
	if delim == '\t' {
		blank = " "
	}
	for {
		cell, rest, more := s, "", false
		if quoted, ok := strings.CutPrefix(strings.TrimLeft(s, blank), `"`); ok {
			var b strings.Builder
			for {
				part, tail, closed := strings.Cut(quoted, `"`)
				if !closed {
					return nil, "a quote that is not closed"
				}
				b.WriteString(part)
				var again bool
				if quoted, again = strings.CutPrefix(tail, `"`); !again {
					break
				}
				b.WriteByte('"')
			}
			if quoted = strings.TrimLeft(quoted, blank); quoted != "" && quoted[0] != delim {
				return nil, "text " + quote(quoted) + " after a closing quote"
			}
			cell, more = b.String(), quoted != ""
			if more {
				rest = quoted[1:]
			}
		} else {
			cell, rest, more = strings.Cut(s, string(delim))
			if strings.Contains(cell, `"`) {
				return nil, "a quote inside the cell " + quote(strings.TrimSpace(cell))
			}
		}
		cells = append(cells, strings.TrimSpace(cell))
		if !more {
			return cells, ""
		}
		s = rest
	}
}

// looksLikeRow reports whether a first row holds readings where names were due.
func looksLikeRow(cells []string) bool {
	for _, c := range cells {
		if _, err := strconv.ParseFloat(strings.ReplaceAll(c, ",", "."), 64); c != "" && err != nil {
			return false
		}
	}
	return true
}

// example is the shortest header row.
func example(headings []heading) string { return headings[0].name + ",luminance_cd_m2" }

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return strconv.Itoa(n) + " " + what + "s"
}

// shorten keeps the text of a foreign error within a line.
func shorten(s string) string {
	q := quote(s)
	return q[1 : len(q)-1]
}
