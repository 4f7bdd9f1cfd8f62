package logs

import (
	"bytes"
	"errors"
	"io"
)

// maxRecord bounds one record of a log in bytes.
const maxRecord = 1 << 20

// Reasons why a record cannot be read.
var (
	errLong   = errors.New("longer than 1 MiB")
	errQuote  = errors.New("a quote that is not closed or stands inside a field")
	errBinary = errors.New("bytes that are no text")
)

var quoteMark = []byte{'"'}

// splitter cuts a stream into the records and fields of RFC 4180. Lines may end
// in LF or CRLF; empty lines and a byte order mark are passed over. It holds one record at a time.
type splitter struct {
	src    io.Reader
	buf    []byte
	lo, hi int // what is read and not yet used
	end    bool
	failed error

	line   int // where the present record starts, from 1
	lines  int // lines passed so far
	quotes int // in the present record
	fields [][]byte
	plain  []byte // fields with their quotes taken off
}

func (s *splitter) reset(r io.Reader) {
	*s = splitter{src: r, buf: s.buf, fields: s.fields[:0], plain: s.plain[:0]}
	if s.buf == nil {
		s.buf = make([]byte, 1<<16)
	}
}

// fill reads on behind hi. It reports false where nothing more comes or fits.
func (s *splitter) fill() bool {
	if s.end || s.failed != nil {
		return false
	}
	if s.lo > 0 {
		s.hi = copy(s.buf, s.buf[s.lo:s.hi])
		s.lo = 0
	}
	if s.hi == len(s.buf) {
		if len(s.buf) > maxRecord {
			s.failed = errLong
			return false
		}
		s.buf = append(s.buf, make([]byte, len(s.buf))...)
	}
	for range 100 {
		n, err := s.src.Read(s.buf[s.hi:])
		s.hi += n
		switch {
		case err == io.EOF:
			s.end = true
			return n > 0
		case err != nil:
			s.failed = err
			return false
		case n > 0:
			return true
		}
	}
	s.failed = io.ErrNoProgress
	return false
}

// next cuts the next record. Its fields last until the next call. It returns
// io.EOF at the end.
func (s *splitter) next() ([][]byte, error) {
	for {
		record, err := s.record()
		if err != nil {
			return nil, err
		}
		if s.line == 1 {
			record = bytes.TrimPrefix(record, []byte("\xef\xbb\xbf"))
		}
		if len(record) == 0 {
			continue
		}
		if s.quotes > 0 {
			return s.quoted(record)
		}
		s.fields = s.fields[:0]
		for {
			i := bytes.IndexByte(record, ',')
			if i < 0 {
				break
			}
			s.fields = append(s.fields, record[:i])
			record = record[i+1:]
		}
		s.fields = append(s.fields, record)
		return s.fields, nil
	}
}

// record returns the bytes of the next record without its line end. A line end
// inside quotes does not end it.
func (s *splitter) record() ([]byte, error) {
	s.line = s.lines + 1
	s.quotes = 0
	from := s.lo
	for {
		i := bytes.IndexByte(s.buf[from:s.hi], '\n')
		if i < 0 {
			s.quotes += bytes.Count(s.buf[from:s.hi], quoteMark)
			done := s.hi - s.lo
			if s.fill() {
				from = s.lo + done
				continue
			}
			return s.last()
		}
		s.lines++
		s.quotes += bytes.Count(s.buf[from:from+i], quoteMark)
		from += i + 1
		if from-s.lo > maxRecord {
			return nil, errLong
		}
		if s.quotes%2 == 0 {
			record := s.buf[s.lo : from-1]
			s.lo = from
			return bytes.TrimSuffix(record, []byte{'\r'}), nil
		}
	}
}

// last returns what stands behind the last line end.
func (s *splitter) last() ([]byte, error) {
	if s.failed != nil {
		return nil, s.failed
	}
	record := s.buf[s.lo:s.hi]
	switch {
	case len(record) == 0:
		return nil, io.EOF
	case len(record) > maxRecord:
		return nil, errLong
	case s.quotes%2 == 1:
		return nil, errQuote
	}
	s.lo = s.hi
	s.lines++
	return bytes.TrimSuffix(record, []byte{'\r'}), nil
}

// quoted cuts a record in which quotes occur.
func (s *splitter) quoted(record []byte) ([][]byte, error) {
	s.fields, s.plain = s.fields[:0], s.plain[:0]
	if cap(s.plain) < len(record) {
		s.plain = make([]byte, 0, 2*len(record))
	}
	for {
		start := len(s.plain)
		if len(record) > 0 && record[0] == '"' {
			rest, ok := s.unquote(record[1:])
			if !ok {
				return nil, errQuote
			}
			record = rest
		} else {
			i := bytes.IndexByte(record, ',')
			if i < 0 {
				i = len(record)
			}
			if bytes.IndexByte(record[:i], '"') >= 0 {
				return nil, errQuote
			}
			s.plain = append(s.plain, record[:i]...)
			record = record[i:]
		}
		s.fields = append(s.fields, s.plain[start:len(s.plain):len(s.plain)])
		if len(record) == 0 {
			return s.fields, nil
		}
		record = record[1:]
	}
}

// unquote appends a quoted field, of which the first quote is read, and returns
// what follows: nothing or a comma and more.
func (s *splitter) unquote(record []byte) (rest []byte, ok bool) {
	for {
		i := bytes.IndexByte(record, '"')
		if i < 0 {
			return nil, false
		}
		s.plain = append(s.plain, record[:i]...)
		record = record[i+1:]
		if len(record) == 0 || record[0] == ',' {
			return record, true
		}
		if record[0] != '"' {
			return nil, false
		}
		s.plain = append(s.plain, '"')
		record = record[1:]
	}
}
