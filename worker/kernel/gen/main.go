// Command gen writes the assembly of packages kernel and sketch for amd64.
//
// It is a module of its own, so that the program itself does not depend on the
// generator. Each set of routines is one .s file and its Go stubs; the lines for
// go generate that call it stand beside the Go twins:
//
//	go run . -set vectors -pkg kernel -out ../vectors_amd64.s -stubs ../vectors_amd64.go
//
// No routine fuses a product with a sum, because its twin does not.
package main

import (
	"flag"
	"log"

	"github.com/mmcloughlin/avo/build"
)

func main() {
	sets := map[string]func(){
		"product": product,
		"sketch":  sketchGroups,
		"vectors": vectors,
	}
	set := flag.String("set", "", "which routines to write")
	flag.Parse()
	write := sets[*set]
	if write == nil {
		log.Fatalf("gen: no set of routines is called %q", *set)
	}
	build.ConstraintExpr("!noasm")
	write()
	build.Generate()
}
