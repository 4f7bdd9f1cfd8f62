package launch

import (
	"bytes"
	"os"
)

// keyboard is the terminal's input. An Escape in the same read as a paste that
// follows would be taken for a modifier of the paste's own mark, and the pasted
// letters for keys: such an Escape is dropped.
type keyboard struct{ *os.File }

// pasteMark begins what is pasted.
var pasteMark = []byte("\x1b[200~")

// Read takes what is there.
func (k keyboard) Read(p []byte) (int, error) {
	n, err := k.File.Read(p)
	return dropEscape(p[:max(n, 0)]), err
}

// dropEscape removes every Escape right before the mark of a paste, also where the
// read ends within the mark, and returns the new length.
func dropEscape(p []byte) int {
	doubled := append([]byte{0x1b}, pasteMark...)
	for {
		i := bytes.Index(p, doubled)
		if i < 0 {
			break
		}
		p = append(p[:i], p[i+1:]...)
	}
	for cut := len(doubled) - 1; cut > 3; cut-- { // from ESC ESC [ 2 on no key's sequence fits
		if bytes.HasSuffix(p, doubled[:cut]) {
			i := len(p) - cut
			return len(append(p[:i], p[i+1:]...))
		}
	}
	return len(p)
}
