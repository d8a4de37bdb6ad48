package main

import "github.com/spf13/cobra"

func (a *app) solveCommand() *cobra.Command {
	var s solveFlags
	c := &cobra.Command{
		Use:   "solve A.mtx b.mtx",
		Short: "solve A·x = b",
		Long: "Reads the matrix A and the right side b, solves A·x = b, recomputes the residual in the file's own units and " +
			"with every row scaled to unit size, and writes x. Both residuals must reach the tolerance for the verdict \"met\". " +
			"Several columns of b are solved one after another. Files may be Matrix Market, Harwell-Boeing, plain triplets, " +
			".npz or .npy, plain or packed with gzip or Zstandard.",
		Example: "  rowstead solve dam.mtx load.mtx --out heads.mtx\n  rowstead solve dam.mtx --trial\n",
		Args: func(c *cobra.Command, args []string) error {
			if len(args) == 1 || len(args) == 2 {
				return nil
			}
			return usage("solve takes a matrix and a right side, but %d files are given; write: rowstead %s", len(args), c.Use)
		},
		RunE: func(c *cobra.Command, args []string) error {
			s.job.Matrix = args[0]
			if len(args) == 2 {
				s.job.Right = args[1]
			}
			if err := s.check(c.Flags()); err != nil {
				return err
			}
			return a.solve(&session{flags: s, asked: given(c.Flags())})
		},
	}
	c.Flags().SortFlags = false
	s.add(c.Flags())
	a.jsonAndQuiet(c)
	return c
}
