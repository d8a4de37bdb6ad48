package order

import (
	"cmp"
	"math"
	"slices"

	"rowstead/partition/csr"
)

// searches bounds the breadth-first searches for one starting row. Each must
// find a deeper level structure than the last; three or four are usual.
const searches = 16

// numbered marks rows that have their place; lower marks count the searches
// that came by.
const numbered = math.MaxUint8

// CuthillMcKee returns the reverse Cuthill-McKee permutation of the pattern of
// A + Aᵀ: neighbours are numbered level by level, rows of few neighbours first,
// from a row at the rim of each connected component, and then backwards.
// Components stand in the order of their lowest row; equal degrees are broken
// by row number, so that the answer is unique.
//
// m must be square. O(entries·(searches + log of the longest row)), beside the
// pattern 13 bytes a row. Cuthill and McKee, "Reducing the bandwidth of sparse
// symmetric matrices", 1969; the starting row after George and Liu, "An
// implementation of a pseudoperipheral node finder", 1979.
func CuthillMcKee(m *csr.Matrix) []int32 {
	s := &search{graph: newGraph(m), order: make([]int32, m.Rows), mark: make([]uint8, m.Rows)}
	done := 0
	for seed := range m.Rows {
		if s.mark[seed] == numbered {
			continue
		}
		queue := s.order[done:]
		root := s.rim(queue, int32(seed))
		count := s.number(queue, root)
		slices.Reverse(queue[:count])
		done += count
	}
	return s.order
}

type search struct {
	*graph
	order []int32
	mark  []uint8 // by row: 0, the number of the search, or numbered
}

// rim returns a row far from all others in the component of seed. queue is
// scratch memory for the component.
func (s *search) rim(queue []int32, seed int32) int32 {
	root := seed
	depth, last := s.levels(queue, root, 1)
	for k := uint8(2); k <= searches; k++ {
		root = s.thinnest(last)
		deeper, end := s.levels(queue, root, k)
		if deeper <= depth {
			break
		}
		depth, last = deeper, end
	}
	return root
}

// levels searches breadth first from root and returns the number of levels
// beyond it and the rows of the last one. mark is above those of all searches
// before in this component.
func (s *search) levels(queue []int32, root int32, mark uint8) (depth int, last []int32) {
	queue[0] = root
	s.mark[root] = mark
	from, to := 0, 1
	for {
		end := to
		for _, i := range queue[from:to] {
			for _, j := range s.near(i) {
				if s.mark[j] < mark {
					s.mark[j] = mark
					queue[end] = j
					end++
				}
			}
		}
		if end == to {
			return depth, queue[from:to]
		}
		from, to = to, end
		depth++
	}
}

// thinnest returns the row of lowest degree, among equals the lowest row.
func (s *search) thinnest(rows []int32) int32 {
	return slices.MinFunc(rows, s.compare)
}

func (s *search) compare(i, j int32) int {
	return cmp.Or(cmp.Compare(s.degree[i], s.degree[j]), cmp.Compare(i, j))
}

// number writes the component of root in Cuthill-McKee order to queue and
// returns its size.
func (s *search) number(queue []int32, root int32) int {
	queue[0] = root
	s.mark[root] = numbered
	end := 1
	for at := 0; at < end; at++ {
		from := end
		for _, j := range s.near(queue[at]) {
			if s.mark[j] != numbered {
				s.mark[j] = numbered
				queue[end] = j
				end++
			}
		}
		s.sort(queue[from:end])
	}
	return end
}

// sort orders rows, ascending as they come, by degree and then by number.
func (s *search) sort(rows []int32) {
	if len(rows) > 24 {
		slices.SortFunc(rows, s.compare)
		return
	}
	for k := 1; k < len(rows); k++ {
		row := rows[k]
		d, at := s.degree[row], k
		for at > 0 && s.degree[rows[at-1]] > d {
			rows[at] = rows[at-1]
			at--
		}
		rows[at] = row
	}
}
