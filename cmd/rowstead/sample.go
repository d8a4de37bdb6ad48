package main

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"rowstead/cmd/internal/replace"
	"rowstead/partition/matfile"
	"rowstead/partition/samples"
)

func (a *app) sampleCommand() *cobra.Command {
	var out string
	var size int
	var overwrite bool
	c := &cobra.Command{
		Use:   "sample NAME",
		Short: "write a model job of an invented office",
		Long: "Writes NAME.mtx, NAME_rhs.mtx and NAME.txt, which tells the question, the units and what the answer is for. " +
			"The same name and size give the same files everywhere.",
		Example: "  rowstead sample aquifer --out jobs\n",
		Args: func(c *cobra.Command, args []string) error {
			if len(args) == 1 {
				return nil
			}
			return usage("sample takes one name of %s", strings.Join(samples.Names(), ", "))
		},
		RunE: func(c *cobra.Command, args []string) error {
			if c.Flags().Changed("size") && size < 1 {
				return usage("--size %d: expected a whole number of unknowns", size)
			}
			return a.sample(args[0], out, size, overwrite)
		},
	}
	c.Flags().SortFlags = false
	c.Flags().StringVar(&out, "out", ".", "write into folder `DIR` (the working folder)")
	c.Flags().IntVar(&size, "size", 0, "about `COUNT` unknowns (each job has its own)")
	c.Flags().BoolVar(&overwrite, "overwrite", false, "replace existing files")
	a.jsonFlag(c)
	return c
}

// sample writes the files of a model job row by row, so that its size is not
// bounded by memory.
func (a *app) sample(name, folder string, size int, overwrite bool) error {
	model, err := samples.Open(name, size)
	if err != nil {
		return usage("%w", err)
	}
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return usage("--out: %w", replace.Plain(err))
	}
	matrix, right, notes := filepath.Join(folder, name+".mtx"), filepath.Join(folder, name+"_rhs.mtx"), filepath.Join(folder, name+".txt")
	for _, path := range []string{matrix, right, notes} {
		if exists(path) && !overwrite {
			return usage("%s: it exists already; --overwrite replaces it, --out DIR writes elsewhere", path)
		}
	}
	a.hold("sample", nil, matrix, right)
	options := matfile.WriteOptions{Overwrite: overwrite, Comment: []string{model.Title, fmt.Sprintf("rowstead sample %s, %d unknowns", name, model.Rows())}}
	if err := writeModel(matrix, model, options); err != nil {
		return replace.Plain(err)
	}
	a.wrote(matrix)
	b := &matfile.Dense{Rows: model.Rows(), Cols: 1, Values: model.Right()}
	if err := matfile.WriteDense(right, b, options); err != nil {
		return replace.Plain(err)
	}
	a.wrote(right)
	err = a.pending.Write(notes, overwrite, func(w io.Writer) error {
		_, err := io.WriteString(w, model.Notes())
		return err
	})
	if err != nil {
		return replace.Plain(err)
	}
	return a.tellSample(model, matrix, right, notes)
}

// wrote notes a finished file for the interrupt handler.
func (a *app) wrote(path string) {
	a.mu.Lock()
	defer a.mu.Unlock()
	a.written = append(a.written, path)
}

// writeModel writes the matrix, its lower half where it is symmetric. The
// entries are counted first, because the header tells them.
func writeModel(path string, model *samples.Model, options matfile.WriteOptions) error {
	head := matfile.Header{Rows: model.Rows(), Cols: model.Rows(), Symmetry: "general"}
	if model.Symmetric {
		head.Symmetry = "symmetric"
	}
	each := func(yield func(i, j int, v float64) error) error {
		return model.EachRow(func(row int, cols []int32, vals []float64) error {
			for k, c := range cols {
				if model.Symmetric && int(c) > row {
					break
				}
				if err := yield(row, int(c), vals[k]); err != nil {
					return err
				}
			}
			return nil
		})
	}
	err := each(func(int, int, float64) error { head.Stored++; return nil })
	if err != nil {
		return err
	}
	return matfile.WriteMatrixStream(path, head, options, each)
}

// tellSample says what was written and what to do with it.
func (a *app) tellSample(model *samples.Model, matrix, right, notes string) error {
	if a.json {
		text, err := json.Marshal(map[string]any{"name": model.Name, "rows": model.Rows(), "files": []string{matrix, right, notes}})
		if err != nil {
			return err
		}
		a.sayObject(append(text, '\n'))
		return nil
	}
	_, err := fmt.Fprintf(a.stdout, "%s: %d unknowns.\nWritten: %s, %s, %s\nNext: rowstead solve %s %s\n",
		model.Title, model.Rows(), matrix, right, notes, matrix, right)
	return err
}
