package main

import (
	"fmt"
	"os"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/cobra/doc"
)

func newManCommand() *cobra.Command {
	return &cobra.Command{
		Use:     "man DIR",
		Short:   "Write the manual pages of all commands to a folder",
		Example: "  catena man ~/.local/share/man/man1",
		Args:    args(cobra.ExactArgs(1)),
		RunE: func(cmd *cobra.Command, dirs []string) error {
			if err := os.MkdirAll(dirs[0], 0o755); err != nil {
				return fmt.Errorf("write manual pages: %w", err)
			}
			// a fixed date, so that the same program writes the same pages
			date := time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC)
			root := cmd.Root()
			root.DisableAutoGenTag = true
			return doc.GenManTree(root, &doc.GenManHeader{Title: "CATENA", Section: "1", Source: "catena", Date: &date}, dirs[0])
		},
	}
}
