package logs

import (
	"bufio"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// Writer writes the rows of a replay as CSV: t, one column per state estimate
// (absolute values), one "<sensor> innovation" per sensor, empty where it was lost.
// All numbers read back exactly.
type Writer struct {
	out  *bufio.Writer
	line []byte
}

// NewWriter writes the header.
func NewWriter(w io.Writer, l *Layout) (*Writer, error) {
	c := &Writer{out: bufio.NewWriterSize(w, 1<<16)}
	names := []string{timeName}
	for _, s := range l.States {
		names = append(names, s.Name)
	}
	for _, s := range l.Sensors {
		names = append(names, s.Name+" innovation")
	}
	for i, s := range names {
		if strings.ContainsAny(s, ",\"\r\n") {
			names[i] = `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
		}
	}
	if _, err := c.out.WriteString(strings.Join(names, ",") + "\n"); err != nil {
		return nil, fmt.Errorf("writing the header: %w", err)
	}
	return c, nil
}

// Row writes one row; it fits Request.Each.
func (c *Writer) Row(r *Row) error {
	b := strconv.AppendFloat(c.line[:0], r.Sample.T, 'g', -1, 64)
	for _, v := range r.Estimate {
		b = append(b, ',')
		b = strconv.AppendFloat(b, v, 'g', -1, 64)
	}
	for _, v := range r.Innovation {
		b = append(b, ',')
		if v == v {
			b = strconv.AppendFloat(b, v, 'g', -1, 64)
		}
	}
	c.line = append(b, '\n')
	if _, err := c.out.Write(c.line); err != nil {
		return fmt.Errorf("writing a row: %w", err)
	}
	return nil
}

// Flush writes what is left.
func (c *Writer) Flush() error {
	if err := c.out.Flush(); err != nil {
		return fmt.Errorf("writing the last rows: %w", err)
	}
	return nil
}
