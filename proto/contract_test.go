package proto

import (
	"fmt"
	"os"
	"regexp"
	"sort"
	"strings"
	"testing"

	"google.golang.org/protobuf/reflect/protoreflect"
)

// Every message, field, enum value and call of rowstead.proto is in the generated
// code, and nothing else: a contract that was changed without making the code
// anew is found here.
func TestGeneratedCodeIsOfThisContract(t *testing.T) {
	text, err := os.ReadFile("rowstead.proto")
	if err != nil {
		t.Fatal(err)
	}
	want, got := written(t, string(text)), generated()
	sort.Strings(want)
	sort.Strings(got)
	for len(want) > 0 || len(got) > 0 {
		switch {
		case len(got) == 0 || (len(want) > 0 && want[0] < got[0]):
			t.Errorf("only in rowstead.proto: %s", want[0])
			want = want[1:]
		case len(want) == 0 || got[0] < want[0]:
			t.Errorf("only in the generated code: %s", got[0])
			got = got[1:]
		default:
			want, got = want[1:], got[1:]
		}
	}
}

var (
	comment = regexp.MustCompile(`//[^\n]*`)
	opening = regexp.MustCompile(`^(message|enum|service|oneof)\s+(\w+)$`)
	field   = regexp.MustCompile(`^(repeated\s+)?([\w.]+)\s+(\w+)\s*=\s*(\d+)$`)
	value   = regexp.MustCompile(`^(\w+)\s*=\s*(\d+)$`)
	call    = regexp.MustCompile(`^rpc\s+(\w+)\(stream (\w+)\) returns \(stream (\w+)\)$`)
)

// written lists what the source says, one statement a line, by full name.
func written(t *testing.T, text string) []string {
	t.Helper()
	var out, scope []string
	_, text, _ = strings.Cut(comment.ReplaceAllString(text, ""), "option go_package")
	_, text, _ = strings.Cut(text, ";")
	for text = strings.TrimSpace(text); text != ""; text = strings.TrimSpace(text) {
		end := strings.IndexAny(text, ";{}")
		statement, mark := strings.TrimSpace(text[:end]), text[end]
		text = text[end+1:]
		path := strings.Join(scope, ".")
		switch {
		case mark == '}':
			scope = scope[:len(scope)-1]
		case mark == '{':
			m := opening.FindStringSubmatch(statement)
			if m == nil {
				t.Fatalf("not understood: %s {", statement)
			}
			if m[1] == "oneof" {
				scope = append(scope, "") // its fields belong to the message
				continue
			}
			scope = append(scope, m[2])
		case field.MatchString(statement):
			m := field.FindStringSubmatch(statement)
			kind := m[2][strings.LastIndexByte(m[2], '.')+1:]
			out = append(out, fmt.Sprintf("%s.%s = %s %v %s", strings.Trim(path, "."), m[3], m[4], m[1] != "", kind))
		case value.MatchString(statement):
			m := value.FindStringSubmatch(statement)
			out = append(out, fmt.Sprintf("%s.%s = %s", path, m[1], m[2]))
		case call.MatchString(statement):
			m := call.FindStringSubmatch(statement)
			out = append(out, fmt.Sprintf("%s.%s %s %s", path, m[1], m[2], m[3]))
		default:
			t.Fatalf("not understood: %s", statement)
		}
	}
	return out
}

// generated lists the same of the descriptors in the generated code.
func generated() []string {
	var out []string
	file := File_rowstead_proto
	local := func(d protoreflect.Descriptor) string {
		return strings.TrimPrefix(string(d.FullName()), "rowstead.")
	}
	enums := func(list protoreflect.EnumDescriptors) {
		for i := range list.Len() {
			values := list.Get(i).Values()
			for k := range values.Len() {
				out = append(out, fmt.Sprintf("%s.%s = %d", local(list.Get(i)), values.Get(k).Name(), values.Get(k).Number()))
			}
		}
	}
	var messages func(list protoreflect.MessageDescriptors)
	messages = func(list protoreflect.MessageDescriptors) {
		for i := range list.Len() {
			m := list.Get(i)
			for k := range m.Fields().Len() {
				f := m.Fields().Get(k)
				kind := f.Kind().String()
				switch {
				case f.Message() != nil:
					kind = string(f.Message().Name())
				case f.Enum() != nil:
					kind = string(f.Enum().Name())
				}
				out = append(out, fmt.Sprintf("%s.%s = %d %v %s", local(m), f.Name(), f.Number(), f.IsList(), kind))
			}
			messages(m.Messages())
			enums(m.Enums())
		}
	}
	messages(file.Messages())
	enums(file.Enums())
	for i := range file.Services().Len() {
		methods := file.Services().Get(i).Methods()
		for k := range methods.Len() {
			m := methods.Get(k)
			out = append(out, fmt.Sprintf("%s %s %s", local(m), local(m.Input()), local(m.Output())))
		}
	}
	return out
}
