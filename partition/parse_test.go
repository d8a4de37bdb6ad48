package partition

import (
	"encoding/json"
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func TestParseCuts(t *testing.T) {
	cases := []struct {
		name, text string
		want       []int
		fault      string // a part of the error
	}{
		{"words", "0 8\n64\n", []int{0, 8, 64}, ""},
		{"end given", "0 8 100", []int{0, 8}, ""},
		{"list", " [0, 8,\n 64]\n", []int{0, 8, 64}, ""},
		{"one block", "0", []int{0}, ""},
		{"one block with its end", "0 100", []int{0}, ""},
		{"empty", " \n", nil, "no block"},
		{"empty list", "[]", nil, "no block"},
		{"no zero", "8 16", nil, "begins at row 8; want 0"},
		{"not a multiple", "0 13", nil, "such as 8"},
		{"descending", "0 16 8", nil, "block 2 begins at row 8, not after"},
		{"twice", "0 16 16", nil, "not after"},
		{"beyond", "0 104", nil, "has 100 rows"},
		{"negative", "0 -8", nil, "not after"},
		{"text", "0 8\n16 x24", nil, `line 2: "x24"`},
		{"fraction", "0 8.5", nil, "whole number"},
		{"broken list", "[0, 8", nil, "want a list"},
		{"list of texts", `["0"]`, nil, "want a list"},
		{"list and more", "[0] 8", nil, "want a list"},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			got, err := ParseCuts(c.text, 100)
			if c.fault != "" {
				if err == nil || !strings.Contains(err.Error(), c.fault) {
					t.Fatalf("ParseCuts(%q) error %v, want it to say %q", c.text, err, c.fault)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(c.want, got.Starts()); diff != "" {
				t.Errorf("ParseCuts(%q) −want +got:\n%s", c.text, diff)
			}
		})
	}
}

func TestReadCutsRefusesAMatrixFile(t *testing.T) {
	if _, err := ReadCuts(strings.NewReader(strings.Repeat("0 ", maxCutsText)), 100); err == nil || !strings.Contains(err.Error(), "longer than") {
		t.Errorf("ReadCuts of 2 MiB: error %v", err)
	}
}

// What Starts gives, as words or as a list, reads back as the same cuts.
func TestCutsRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rows, blocks := rapid.IntRange(0, 2000).Draw(t, "rows"), rapid.IntRange(1, 50).Draw(t, "blocks")
		want, err := EvenCuts(rows, blocks)
		if err != nil {
			t.Fatal(err)
		}
		list, err := json.Marshal(want.Starts())
		if err != nil {
			t.Fatal(err)
		}
		for _, text := range []string{string(list), strings.Trim(fmt.Sprint(want.Starts()), "[]")} {
			got, err := ReadCuts(strings.NewReader(text), rows)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(want.first, got.first); diff != "" {
				t.Fatalf("%q: −want +got:\n%s", text, diff)
			}
		}
	})
}

func FuzzParseCuts(f *testing.F) {
	f.Add("0 8 16", 100)
	f.Add("[0,8]", 9)
	f.Add("[0,8e0]", 9)
	f.Fuzz(func(t *testing.T, text string, rows int) {
		c, err := ParseCuts(text, rows)
		if err != nil {
			return
		}
		again, err := FromStarts(c.Starts(), rows)
		if err != nil || again.Blocks() != c.Blocks() || c.Rows() != rows {
			t.Fatalf("ParseCuts(%q, %d) = %v, which FromStarts refuses: %v", text, rows, c.Starts(), err)
		}
	})
}
