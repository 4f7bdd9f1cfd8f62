// Polewright tunes the poles of a state estimator by feel, in a terminal.
package main

import (
	"os"

	"polewright/ui/cli"
)

func main() {
	os.Exit(cli.Run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr))
}
