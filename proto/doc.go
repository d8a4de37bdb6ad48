// Package proto is the contract of the wire: the control part of every message
// between a coordinator and its workers, and between workers, generated from
// rowstead.proto. Blocks of numbers travel beside it by package proto/frame.
//
// The generated files are committed. After a change of rowstead.proto they are
// made anew, in this folder, with protoc 3.21.12 (Debian's protobuf-compiler) and
//
//	go install google.golang.org/protobuf/cmd/protoc-gen-go@v1.36.12
//	go install google.golang.org/grpc/cmd/protoc-gen-go-grpc@v1.6.2
//	protoc --go_out=. --go_opt=paths=source_relative --go-grpc_out=. --go-grpc_opt=paths=source_relative rowstead.proto
//
// A test compares the descriptors in the generated code with rowstead.proto, so
// that a forgotten one is found without these tools.
package proto

// Version is the number of this contract; both sides must have the same one.
const Version = 1
