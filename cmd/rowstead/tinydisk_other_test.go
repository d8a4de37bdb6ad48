//go:build !linux

package main

import "errors"

func canMount() bool { return false }

func mountTiny(string, string) (func(), error) {
	return nil, errors.New("only Linux mounts a disk for a test")
}
