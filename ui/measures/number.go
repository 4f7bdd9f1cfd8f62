package measures

import (
	"encoding/json"
	"strconv"
)

func appendFloat(dst []byte, f float64) []byte {
	b, err := json.Marshal(f)
	if err != nil { // not finite; the caller has dealt with that
		return append(dst, "null"...)
	}
	return append(dst, b...)
}

func parseFloat(b []byte) (float64, error) { return strconv.ParseFloat(string(b), 64) }
