package cli

import (
	"fmt"
	"os"
	"path/filepath"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/session"
)

func newLibrary() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "library",
		Short: "List the built-in plants and scenarios, all invented",
		Long: `List the built-in plants and their scenarios. All of them are invented; they are
there to learn on and to start a file of your own from.`,
		Args: cobra.NoArgs,
		RunE: func(cmd *cobra.Command, _ []string) error { return listLibrary(cmd) },
	}
	cmd.AddCommand(newLibraryCopy())
	return cmd
}

func listLibrary(cmd *cobra.Command) error {
	tw := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 8, 2, ' ', 0)
	for _, name := range library.Names() {
		text, file, _ := library.Plant(name)
		p, err := plants.Parse(file, text)
		if err != nil {
			return err
		}
		fmt.Fprintf(tw, "%s\t%s\n", name, p.Name)
		for _, f := range library.Scenarios(name) {
			sc, err := scenarios.Parse(f.Name, f.Text, p)
			if err != nil {
				return err
			}
			fmt.Fprintf(tw, "  %s\t%s\n", scenarioWord(f.Name), sc.Name)
		}
	}
	return tw.Flush()
}

func newLibraryCopy() *cobra.Command {
	var force bool
	cmd := &cobra.Command{
		Use:   "copy NAME DIR",
		Short: "Copy a built-in plant and its scenarios as a starting point",
		Args:  cobra.ExactArgs(2),
		ValidArgsFunction: func(_ *cobra.Command, args []string, _ string) ([]string, cobra.ShellCompDirective) {
			if len(args) == 0 {
				return library.Names(), cobra.ShellCompDirectiveNoFileComp
			}
			return nil, cobra.ShellCompDirectiveFilterDirs
		},
		RunE: func(cmd *cobra.Command, args []string) error { return copyPlant(cmd, args[0], args[1], force) },
	}
	cmd.Flags().BoolVar(&force, "force", false, "overwrite existing files")
	return cmd
}

func copyPlant(cmd *cobra.Command, name, dir string, force bool) error {
	text, file, ok := library.Plant(name)
	if !ok {
		return &plants.Error{Where: "library copy", Wrong: fmt.Sprintf("no built-in plant %q", name), Expected: "a name that 'polewright library' lists"}
	}
	files := append([]library.File{{Name: file, Text: text}}, library.Scenarios(name)...)
	if !force { // nothing is written where one of them is in the way
		for _, f := range files {
			if _, err := os.Lstat(filepath.Join(dir, f.Name)); err == nil {
				return fileError(filepath.Join(dir, f.Name), "a new file (--force overwrites)", os.ErrExist)
			}
		}
	}
	for _, f := range files {
		path := filepath.Join(dir, f.Name)
		if err := session.WriteNew(path, f.Text, force); err != nil {
			return fileError(path, "a folder that can be written to", err)
		}
		fmt.Fprintln(cmd.OutOrStdout(), path)
	}
	return nil
}
