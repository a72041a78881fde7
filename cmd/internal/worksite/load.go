package worksite

import (
	"errors"
	"fmt"
	"io"
	"os"
	"reflect"
	"slices"
	"strings"

	"github.com/goccy/go-yaml"
	"github.com/goccy/go-yaml/ast"
	"github.com/goccy/go-yaml/parser"
)

// maxFileBytes is far above any worksite a person writes, and keeps a survey
// given by mistake from being parsed as YAML.
const maxFileBytes = 1 << 20

// Load reads and checks a worksite file. Errors are of type *Error.
func Load(path string) (*Worksite, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, &Error{File: path, Reason: reason(err), Remedy: "give the path of a worksite file; 'ledgework init' writes one"}
	}
	defer f.Close()
	src, err := io.ReadAll(io.LimitReader(f, maxFileBytes+1))
	if err != nil {
		return nil, &Error{File: path, Reason: reason(err), Remedy: "give the path of a worksite file"}
	}
	if len(src) > maxFileBytes || strings.IndexByte(string(src), 0) >= 0 {
		return nil, &Error{File: path, Reason: "is no worksite file", Remedy: "'ledgework init' writes one for a survey"}
	}
	return Parse(path, src)
}

// Parse reads and checks a worksite. File names in it are relative to the
// folder of path. Errors are of type *Error.
func Parse(path string, src []byte) (_ *Worksite, err error) {
	defer func() {
		// The YAML library has panicked on input that is no YAML at all.
		if p := recover(); p != nil {
			err = &Error{Reason: "cannot be understood as YAML", Remedy: "mind indentation, brackets and quotes"}
		}
		var e *Error
		if errors.As(err, &e) {
			e.File = path
			err = e
		}
	}()
	tree, err := parser.ParseBytes(src, 0)
	if err != nil {
		return nil, located(err)
	}
	docs := slices.DeleteFunc(tree.Docs, func(d *ast.DocumentNode) bool { return d.Body == nil })
	if len(docs) > 1 {
		return nil, errorAt(docs[1].Body, "a second document begins", "keep one worksite in one file")
	}
	if len(docs) == 0 {
		return nil, &Error{Reason: "the file is empty", Remedy: "'ledgework init' writes a worksite for a survey"}
	}
	tree.Docs = docs
	plain := &plainChecker{}
	if ast.Walk(plain, docs[0].Body); plain.err != nil {
		return nil, plain.err
	}
	w := Default()
	w.path, w.tree = path, tree
	if err := yaml.NodeToValue(docs[0].Body, w, yaml.Strict()); err != nil {
		return nil, located(err)
	}
	return w, w.validate()
}

// A plainChecker finds the first YAML feature that a worksite has no use for,
// and that could make a short file stand for a huge one.
type plainChecker struct {
	err *Error
}

// Visit implements ast.Visitor.
func (c *plainChecker) Visit(n ast.Node) ast.Visitor {
	if c.err != nil {
		return nil
	}
	switch n.(type) {
	case *ast.TagNode, *ast.AnchorNode, *ast.AliasNode, *ast.MergeKeyNode, *ast.DirectiveNode:
		c.err = errorAt(n, "tags, anchors and aliases are not used in a worksite", "write the value itself")
		return nil
	}
	return c
}

// located turns an error of the YAML library into one with a place, a reason
// in the words of the file's reader, and a remedy.
func located(err error) *Error {
	var own *Error
	if errors.As(err, &own) {
		return own
	}
	var ye yaml.Error
	if !errors.As(err, &ye) {
		return &Error{Reason: err.Error()}
	}
	e := &Error{Reason: ye.GetMessage()}
	value := ""
	if t := ye.GetToken(); t != nil {
		value = t.Value
		if t.Position != nil {
			e.Line, e.Column = t.Position.Line, t.Position.Column
		}
	}
	var (
		unknown *yaml.UnknownFieldError
		typed   *yaml.TypeError
		over    *yaml.OverflowError
		node    *yaml.UnexpectedNodeTypeError
	)
	switch {
	case errors.As(err, &unknown):
		e.Reason = fmt.Sprintf("unknown key %q", value)
		if s := nearest(value, keys(reflect.TypeFor[Worksite](), nil)); s != "" {
			e.Remedy = fmt.Sprintf("did you mean %q?", s)
		} else {
			e.Remedy = "'ledgework init' writes a file with every key"
		}
	case errors.As(err, &typed):
		e.Reason = fmt.Sprintf("%q is not %s", value, wanted(typed.DstType))
	case errors.As(err, &over):
		e.Reason = fmt.Sprintf("%s is out of range", over.SrcNum)
	case errors.As(err, &node):
		e.Reason = strings.ReplaceAll(ye.GetMessage(), "mapping", "a block of keys")
		e.Remedy = "compare with the file that 'ledgework init' writes"
	default:
		e.Remedy = "mind indentation, brackets and quotes"
	}
	return e
}

// wanted says what a value of type t looks like in the file.
func wanted(t reflect.Type) string {
	switch t.Kind() {
	case reflect.Bool:
		return "true or false"
	case reflect.Float64:
		return "a number"
	case reflect.Int, reflect.Uint8:
		return "a whole number"
	case reflect.Slice:
		return "a list"
	case reflect.String:
		return "text"
	}
	return "a block of keys"
}

// reason is an operating system error without the operation and path.
func reason(err error) string {
	var pe *os.PathError
	if errors.As(err, &pe) {
		return pe.Err.Error()
	}
	return err.Error()
}
