package main

import (
	"cmp"
	"errors"
	"fmt"
	"os"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"catena/ingest/collection"
	"catena/ingest/store"
	"catena/queries/table"
)

func newCheckCommand(g *globalOptions) *cobra.Command {
	cmd := &cobra.Command{
		Use:   "check",
		Short: "Look whether the collection is sound",
		Long: `Looks at every page of the database and every reference between its tables, at
each occurrence and each earlier content against the hash that it was stored
under, at tags and chains, at the rows set aside, and whether the index holds
each occurrence and nothing else. It changes nothing, and exits with 1 where
something is wrong.`,
		Example: `  catena check`,
		Args:    args(cobra.NoArgs),
		RunE:    func(cmd *cobra.Command, _ []string) error { return runCheck(cmd, g) },
	}
	g.addAt(cmd.Flags())
	return cmd
}

func runCheck(cmd *cobra.Command, g *globalOptions) error {
	c, err := g.open(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	totals, err := c.Store.Totals(cmd.Context())
	if err != nil {
		return err
	}
	bar := newProgress(cmd.ErrOrStderr())
	k, err := c.Check(cmd.Context(), func(n int) { bar.show("checking", int64(n), int64(totals.Occurrences)) })
	bar.finish()
	if err != nil {
		return explainOpen(err)
	}
	out := cmd.OutOrStdout()
	for _, f := range k.Faults {
		fmt.Fprintln(out, clean(f))
	}
	if k.More > 0 {
		fmt.Fprintf(out, "and %s more\n", table.Thousands(int64(k.More)))
	}
	looked := fmt.Sprintf("occurrences %s, tags %s, earlier contents %s, rows set aside %s, and the index",
		table.Thousands(int64(k.Occurrences)), table.Thousands(int64(k.Tags)), table.Thousands(int64(k.Revisions)), table.Thousands(int64(totals.SetAside)))
	if n := len(k.Faults) + k.More; n > 0 {
		return hint(fmt.Errorf("faults: %d; looked at %s", n, looked), "a damaged index mends itself; for the database, go back to a backup: catena restore FILE --replace")
	}
	fmt.Fprintf(out, "sound: %s\n", looked)
	return nil
}

func newBackupCommand(g *globalOptions) *cobra.Command {
	force := false
	cmd := &cobra.Command{
		Use:   "backup FILE",
		Short: "Write the collection to one file, also while it is in use",
		Long: `Writes the database as one moment shows it to a file that appears whole or not
at all. What is derived from it (the index) is left out: it is built anew after
a restore. Keep the file on another disk.`,
		Example: `  catena backup /media/stick/reports-2026-07.catena
  catena restore /media/stick/reports-2026-07.catena --at collection-from-july`,
		Args: args(cobra.ExactArgs(1)),
		RunE: func(cmd *cobra.Command, files []string) error {
			c, err := g.open(cmd)
			if err != nil {
				return err
			}
			defer c.Close()
			if err := c.Store.Backup(cmd.Context(), files[0], force); err != nil {
				if errors.Is(err, os.ErrExist) {
					return hint(err, "--force replaces it")
				}
				return err
			}
			info, err := os.Stat(files[0])
			if err != nil {
				return err
			}
			fmt.Fprintf(cmd.ErrOrStderr(), "%s: %s bytes\n", clean(files[0]), table.Thousands(info.Size()))
			return nil
		},
	}
	g.addAt(cmd.Flags())
	cmd.Flags().BoolVar(&force, "force", false, "replace a file that is there")
	return cmd
}

func newRestoreCommand(g *globalOptions) *cobra.Command {
	replace := false
	cmd := &cobra.Command{
		Use:   "restore FILE",
		Short: "Make a collection from a backup",
		Long: `Checks the backup, then puts it in the place of the collection. A collection that
is there already is replaced only with --replace, and its database is kept
beside as catena.db.before-restore. The index is built anew by the next search
or load.`,
		Example: `  catena restore reports-2026-07.catena --replace`,
		Args:    args(cobra.ExactArgs(1)),
		RunE: func(cmd *cobra.Command, files []string) error {
			err := collection.Restore(cmd.Context(), g.at, files[0], replace, collection.Options{
				Command: cmd.Name(), Patience: g.wait, Now: time.Now, Note: noteTo(cmd.ErrOrStderr()),
			})
			switch {
			case errors.Is(err, os.ErrExist):
				return hint(err, "--replace puts the backup in its place; --at names another folder")
			case err != nil:
				return explainOpen(err)
			}
			c, err := g.open(cmd)
			if err != nil {
				return err
			}
			defer c.Close()
			totals, err := c.Store.Totals(cmd.Context())
			if err != nil {
				return err
			}
			fmt.Fprintf(cmd.ErrOrStderr(), "%s: %s occurrences\n", clean(g.at), table.Thousands(int64(totals.Occurrences)))
			return nil
		},
	}
	g.addAt(cmd.Flags())
	g.addWait(cmd.Flags())
	cmd.Flags().BoolVar(&replace, "replace", false, "put it in the place of a collection that is there")
	return cmd
}

type removeOptions struct {
	who, note     string
	list, readmit bool
}

func newRemoveCommand(g *globalOptions) *cobra.Command {
	o := &removeOptions{}
	cmd := &cobra.Command{
		Use:   "remove ID...",
		Short: "Take an occurrence out for good, say because its reporter asks for it",
		Long: `Takes occurrences out of the database and the index, with their raw rows, earlier
contents, tags and decisions, and overwrites what they held. Only the reference
is noted, with who removed it and why; a file that holds it can be loaded again
without bringing it back. Backups made before still hold it.

Where several sources use the same reference, write the source before it, as in
tarnwick/T21-014.`,
		Example: `  catena remove T21-014 --note 'the reporter asked for it'
  catena remove --list
  catena remove --readmit T21-014               let it be loaded again`,
		Args: args(func(cmd *cobra.Command, ids []string) error {
			if o.list {
				return cobra.NoArgs(cmd, ids)
			}
			return cobra.MinimumNArgs(1)(cmd, ids)
		}),
		RunE: func(cmd *cobra.Command, ids []string) error { return runRemove(cmd, g, o, ids) },
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addWait(f)
	f.StringVar(&o.who, "by", "", "who removes (default: the user of this computer)")
	f.StringVar(&o.note, "note", "", "why; kept, so name nobody in it")
	f.BoolVar(&o.list, "list", false, "list what was removed")
	f.BoolVar(&o.readmit, "readmit", false, "let these references be loaded again")
	return cmd
}

func runRemove(cmd *cobra.Command, g *globalOptions, o *removeOptions, ids []string) error {
	ctx := cmd.Context()
	if o.list {
		c, err := g.open(cmd)
		if err != nil {
			return err
		}
		defer c.Close()
		gone, err := c.Store.Removals(ctx)
		if err != nil {
			return err
		}
		t := &table.Table{Title: "references removed", Columns: []table.Column{{Name: "source"}, {Name: "id"}, {Name: "who"}, {Name: "when"}, {Name: "why"}}}
		for _, r := range gone {
			t.Rows = append(t.Rows, []table.Cell{r.Source, r.ID, r.Who, r.At.Format("2006-01-02"), r.Note})
		}
		return writeTable(cmd, t, "text")
	}
	c, err := g.openToWrite(cmd, "")
	if err != nil {
		return err
	}
	defer c.Close()
	if o.readmit {
		for _, ref := range ids {
			was, err := c.Store.Readmit(ctx, "", ref)
			if source, id, ok := strings.Cut(ref, "/"); err == nil && !was && ok {
				was, err = c.Store.Readmit(ctx, source, id)
			}
			if err == nil && !was {
				err = hint(fmt.Errorf("%q was not removed", ref), "catena remove --list shows what was")
			}
			if err != nil {
				return err
			}
			fmt.Fprintf(cmd.ErrOrStderr(), "%s: can be loaded again\n", clean(ref))
		}
		return nil
	}
	// all must be known before the first goes
	keys := make([]int64, len(ids))
	for i, ref := range ids {
		if keys[i], err = oneKey(cmd, c, ref); err != nil {
			return err
		}
	}
	for i, key := range keys {
		err := c.Remove(ctx, key, store.Removal{Who: cmp.Or(o.who, currentUser()), At: time.Now(), Note: o.note})
		switch {
		case errors.Is(err, store.ErrLogBusy):
			noteTo(cmd.ErrOrStderr())(store.ErrLogBusy.Error())
		case err != nil:
			return err
		}
		fmt.Fprintf(cmd.ErrOrStderr(), "%s: removed; backups made before still hold it\n", clean(ids[i]))
	}
	return nil
}
