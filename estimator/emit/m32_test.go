package emit_test

import (
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"polewright/estimator/emit"
)

// start32 runs the self-tests on 32-bit Linux without a C library: the emitted
// code needs none, so this works where no 32-bit library is installed.
const start32 = `
int first_bad(void);
void _start(void);
__attribute__((force_align_arg_pointer, noreturn)) void _start(void)
{
    int bad = first_bad();
    __asm__ volatile("int $0x80" : : "a"(1), "b"(bad));
    for (;;) { }
}
`

// TestSelfTest32 runs the self-tests as 32-bit code: with gcc on the x87 unit,
// which keeps more digits between operations, with clang on SSE.
func TestSelfTest32(t *testing.T) {
	for _, cc := range []string{"gcc", "clang"} {
		t.Run(cc, func(t *testing.T) {
			path := compiler(t, cc)
			dir := t.TempDir()
			var text strings.Builder
			body := ""
			for i, s := range shapes() {
				if i%3 != 0 {
					continue
				}
				src := randomSource(t, s, uint64(i))
				src.Plant = plantName(i)
				files, err := emit.Emit(src, emit.C99)
				if err != nil {
					t.Fatal(err)
				}
				write(t, dir, files)
				pre := strings.TrimSuffix(files[0].Name, ".h")
				text.WriteString("#define " + strings.ToUpper(pre) + "_NO_MAIN\n#include \"" + files[1].Name + "\"\n")
				body += "    if (" + pre + "_selftest() != 0) { return 1; }\n"
			}
			text.WriteString(start32 + "int first_bad(void)\n{\n" + body + "    return 0;\n}\n")
			file, exe := filepath.Join(dir, "all.c"), filepath.Join(dir, "all")
			if err := os.WriteFile(file, []byte(text.String()), 0o644); err != nil {
				t.Fatal(err)
			}
			args := append(append([]string{}, strict...), "-O1", "-m32", "-ffreestanding", "-fno-stack-protector", "-nostdlib", "-static", "-fno-pic", "-o", exe, file)
			if out, err := exec.Command(path, args...).CombinedOutput(); err != nil {
				if strings.Contains(string(out), "cannot find") || strings.Contains(string(out), "incompatible") {
					t.Skipf("%s builds no 32-bit programs here: %s", cc, out)
				}
				t.Fatalf("%v\n%s", err, out)
			}
			err := exec.Command(exe).Run()
			if errors.Is(err, syscall.ENOEXEC) {
				t.Skip("this kernel runs no 32-bit programs; compiled only")
			}
			if err != nil {
				t.Fatalf("self-test in 32 bit: %v", err)
			}
		})
	}
}
