//go:build !amd64 || noasm

package sketch

// addGroups adds whole groups of 8 rows; see addGroupsGo.
func (o Operator) addGroups(dst, w []float64, group uint64) { o.addGroupsGo(dst, w, group) }
