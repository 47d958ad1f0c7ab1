package app

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"

	"nullmark/extract/report"
	"nullmark/extract/store"
)

func (c *command) reportCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "report RESULT_DIR",
		Short: "Render report.html again from the stored data",
		Args:  one("result directory", "nullmark report RESULT_DIR"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return c.report(cmd, args[0])
		},
	}
}

func (c *command) report(cmd *cobra.Command, dir string) error {
	bundle, _, err := store.Read(dir)
	var not *store.NotResult
	if errors.As(err, &not) {
		return coded(ExitUsage, err)
	} else if err != nil {
		return coded(ExitFiles, err)
	}
	var page bytes.Buffer
	if err := report.HTML(&page, bundle); err != nil {
		return fmt.Errorf("cannot draw the report: %w", err)
	}
	if err := store.Add(dir, map[string][]byte{"report.html": page.Bytes()}); err != nil {
		return coded(ExitFiles, err)
	}
	written := filepath.Join(dir, "report.html")
	if c.json {
		return json.NewEncoder(cmd.OutOrStdout()).Encode(map[string]any{"schema": "nullmark.written/1", "written": []string{written}})
	}
	_, err = fmt.Fprintf(cmd.OutOrStdout(), "Written: %s\n", written)
	return err
}
