// Package layout states which package of this module may import which, as
// DEVELOPERS.md lists them, and finds breaches.
//
// Paths are relative to the module, with slashes: "worker/kernel". The package
// reads source text only and starts no program.
package layout

import (
	"fmt"
	"path"
	"sort"
	"strings"
)

// allowed lists, for every package, what of this module it may import. A name
// that ends in "/" stands for everything below it. Tests are free to import
// more, and so are packages of testing aids, named ...test.
var allowed = map[string][]string{
	"partition":            {},
	"partition/csr":        {},
	"partition/matfile":    {"partition/csr"},
	"partition/order":      {"partition/csr"},
	"partition/samples":    {"partition/csr"},
	"partition/audit":      {"partition/matfile", "partition/csr"},
	"sketch":               {},
	"proto":                {},
	"proto/frame":          {},
	"proto/link":           {"proto/"},
	"proto/keys":           {},
	"proto/presence":       {"proto/"},
	"worker":               {"partition/", "partition", "sketch", "worker/"},
	"worker/kernel":        {"partition/csr"},
	"worker/precond":       {"partition/csr", "worker/kernel"},
	"worker/basis":         {"worker/kernel"},
	"worker/halo":          {"partition"},
	"worker/snapshot":      {"worker/basis"},
	"worker/service":       {"worker", "worker/", "partition", "partition/", "proto", "proto/"},
	"coordinator/small":    {},
	"coordinator/method":   {"coordinator/small"},
	"coordinator/course":   {},
	"coordinator/fleet":    {"partition", "partition/", "sketch", "proto", "proto/", "coordinator/method"},
	"coordinator/inproc":   {"coordinator/fleet", "coordinator/method", "worker", "worker/", "partition", "partition/", "sketch"},
	"coordinator/forecast": {"partition"},
	"coordinator/report":   {"partition"},
	"coordinator/page":     {"coordinator/report"},
	"coordinator":          {"coordinator/", "partition", "partition/"},
	"cmd/":                 {"*"},
}

// denied overrides allowed: exact pairs that stay forbidden.
var denied = map[string]string{"coordinator": "coordinator/inproc"}

// rule finds the line for a package: its own, or, for a package inside another
// one (worker/kernel/internal/a, partition/samples/fixed), that of its owner,
// extended by the owner itself and all that lies inside it. The folders at the
// top own only their internal packages.
func rule(pkg string) ([]string, bool) {
	if list, found := allowed[pkg]; found {
		return list, true
	}
	if strings.HasPrefix(pkg, "cmd/") {
		return allowed["cmd/"], true
	}
	for owner := path.Dir(pkg); owner != "."; owner = path.Dir(owner) {
		list, found := allowed[owner]
		if found && (strings.Contains(owner, "/") || strings.HasPrefix(pkg, owner+"/internal/")) {
			return append([]string{owner, owner + "/"}, list...), true
		}
	}
	return nil, false
}

// owns says whether target lies inside pkg: a package may import what is its
// own.
func owns(pkg, target string) bool {
	inside := strings.HasPrefix(target, pkg+"/")
	_, listed := allowed[target]
	return inside && !listed
}

// permits says whether list allows the import of target.
func permits(list []string, target string) bool {
	for _, entry := range list {
		if entry == "*" || entry == target || (strings.HasSuffix(entry, "/") && strings.HasPrefix(target, entry)) {
			return true
		}
	}
	return false
}

// Imports are the packages of this module that each package imports, both
// relative to the module.
type Imports map[string][]string

// Breaches returns one sentence for every import that is not allowed and for
// every package without a rule, sorted.
func (m Imports) Breaches() []string {
	var out []string
	for pkg, targets := range m {
		if strings.HasSuffix(pkg, "test") {
			continue
		}
		list, known := rule(pkg)
		if !known {
			out = append(out, fmt.Sprintf("%s has no rule", pkg))
			continue
		}
		for _, target := range targets {
			if !owns(pkg, target) && (!permits(list, target) || denied[pkg] == target) {
				out = append(out, fmt.Sprintf("%s imports %s", pkg, target))
			}
		}
	}
	sort.Strings(out)
	return out
}
