package main

import (
	"github.com/spf13/cobra"

	"catena/queries"
)

func newChainsCommand(g *globalOptions) *cobra.Command {
	most := 0
	cmd := &cobra.Command{
		Use:   "chains",
		Short: "The commonest ordered chains, and how often they were broken",
		Example: `  catena chains --most 10
  catena chains --only 'power-loss and operation = training'`,
		Args: args(cobra.NoArgs),
		RunE: func(cmd *cobra.Command, _ []string) error {
			if most < 1 {
				return usage(cmd, "--most: want a number above 0")
			}
			c, scope, err := g.openScoped(cmd)
			if err != nil {
				return err
			}
			defer c.Close()
			t, err := queries.Chains(c.Store.Count(cmd.Context()), queries.ChainOptions{Scope: scope, Most: most, Level: 0.95})
			if err != nil {
				return err
			}
			if err := addVersions(cmd.Context(), c, t); err != nil {
				return err
			}
			return g.write(cmd, t)
		},
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addScope(f)
	g.addAs(f, "text", "text, csv, json or md")
	f.IntVar(&most, "most", 20, "how many chains to show")
	return cmd
}
