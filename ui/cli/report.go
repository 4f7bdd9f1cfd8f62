package cli

import (
	"fmt"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"polewright/ui/measures"
	"polewright/ui/report"
	"polewright/ui/session"
)

func newReport() *cobra.Command {
	var out string
	var candidates []string
	var force bool
	cmd := &cobra.Command{
		Use:   "report SESSION --out FILE.html|FILE.md",
		Short: "Write one self-contained document of a session, with figures",
		Long: `Write one self-contained document of a session: the plant, what its sensors see,
every candidate with its poles, gain, noise, start-up, margins, limits and traces,
and where all of it comes from. The ending of FILE chooses HTML, which prints on A4,
or Markdown. It needs no network; the same session gives the same bytes.

` + measures.Caution,
		Example: `  polewright report hoist.session.json --out hoist.html
  polewright report hoist.session.json --candidate B --out hoist-b.md`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			write, err := writer(out)
			if err != nil {
				return err
			}
			for _, name := range candidates {
				if name == "" {
					return usageError("candidate", "empty", "the name of a candidate")
				}
			}
			file := args[0]
			k, err := session.LoadKept(file)
			if err != nil {
				return fileError(file, "a session file", err)
			}
			doc, err := report.Make(cmd.Context(), k, report.Options{Program: "polewright " + Version, Candidates: candidates})
			if err != nil {
				return inFile(file, err)
			}
			data := write(doc)
			if err := session.WriteNew(out, data, force); err != nil {
				return fileError(out, "a new file in an existing folder (--force overwrites)", err)
			}
			_, err = fmt.Fprintf(cmd.OutOrStdout(), "%s: %d bytes\n%s\n", out, len(data), measures.Caution)
			return err
		},
	}
	cmd.Flags().StringVar(&out, "out", "", "file to write, ending in .html or .md")
	cmd.Flags().StringArrayVar(&candidates, "candidate", nil, "show this candidate only; may be given several times")
	cmd.Flags().BoolVar(&force, "force", false, "overwrite an existing file")
	return cmd
}

// writer chooses the form of the document by the ending of its file.
func writer(out string) (func(*report.Document) []byte, error) {
	if out == "" {
		return nil, usageError("out", "not given", "a file that ends in .html or .md")
	}
	switch ending := strings.ToLower(filepath.Ext(out)); ending {
	case ".html", ".htm":
		return (*report.Document).HTML, nil
	case ".md", ".markdown":
		return (*report.Document).Markdown, nil
	default:
		return nil, usageError("out", fmt.Sprintf("the ending %q", ending), ".html or .md")
	}
}
