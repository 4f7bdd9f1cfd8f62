package cli_test

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"github.com/rogpeppe/go-internal/testscript"
)

// blobCmd writes bytes that are no text: blob FILE COUNT
func blobCmd(ts *testscript.TestScript, neg bool, args []string) {
	n := count(ts, neg, args, "blob")
	data := make([]byte, n)
	for i := range data {
		data[i] = byte(i * 7)
	}
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), data, 0o600))
}

// longLineCmd writes a log whose third line has so many bytes: longline FILE COUNT
func longLineCmd(ts *testscript.TestScript, neg bool, args []string) {
	n := count(ts, neg, args, "longline")
	text := "t,pull,tape\n0,0,0.001\n0.01,0," + strings.Repeat("1", n) + "\n0.02,0,0\n"
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), []byte(text), 0o600))
}

func count(ts *testscript.TestScript, neg bool, args []string, name string) int {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: %s FILE COUNT", name)
	}
	n, err := strconv.Atoi(args[1])
	ts.Check(err)
	return n
}

// leftoversCmd holds that no temporary file stands anywhere in the story's folder.
func leftoversCmd(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 0 {
		ts.Fatalf("usage: leftovers")
	}
	ts.Check(filepath.WalkDir(ts.MkAbs("."), func(path string, _ os.DirEntry, err error) error {
		if err == nil && strings.HasPrefix(filepath.Base(path), ".polewright-") {
			ts.Fatalf("left behind: %s", path)
		}
		return err
	}))
}

// provenanceCmd holds that a text names the SHA-256 of a session and of the plant
// in it: provenance SESSION FILE
func provenanceCmd(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: provenance SESSION FILE")
	}
	session, text := ts.ReadFile(args[0]), ts.ReadFile(args[1])
	var doc struct {
		Plant struct{ Text string } `json:"plant"`
	}
	ts.Check(json.Unmarshal([]byte(session), &doc))
	for _, content := range []string{session, doc.Plant.Text} {
		sum := sha256.Sum256([]byte(content))
		if !strings.Contains(text, hex.EncodeToString(sum[:])) {
			ts.Fatalf("%s does not name %x", args[1], sum)
		}
	}
}
