package emit_test

import (
	"fmt"
	"regexp"
	"strconv"
	"strings"
)

// A parser for the part of IEC 61131-3 structured text that is emitted. No
// compiler for the language was found in the package registries; this one
// refuses unknown words, undeclared names and unbalanced blocks, and builds a
// tree that stinterpret_test.go runs.

type stToken struct {
	kind string // "word", "number", "mark", "end"
	text string // words in upper case: the language ignores case
}

var (
	stLex = regexp.MustCompile(`^(?:([A-Za-z][A-Za-z0-9_]*)|([0-9]+\.[0-9]+(?:E[+-][0-9]+)?|[0-9]+)|(:=|<=|>=|<>|\.\.|[-+*/()\[\]<>=.,;:]))`)
	// stWords are the words that cannot be names (IEC 61131-3, table C.2, the
	// part that matters here; from memory).
	stWords = words(`FUNCTION_BLOCK END_FUNCTION_BLOCK PROGRAM END_PROGRAM VAR VAR_INPUT VAR_OUTPUT END_VAR CONSTANT
		ARRAY OF REAL LREAL BOOL DINT INT IF THEN ELSE ELSIF END_IF FOR TO DO BY END_FOR WHILE REPEAT CASE EXIT RETURN
		NOT AND OR XOR MOD TRUE FALSE ABS LREAL_TO_DINT REAL_TO_DINT DINT_TO_LREAL DINT_TO_REAL
		AT RETAIN STRING TIME DATE STEP TASK TYPE STRUCT WITH ON EN ENO N R S L D P`)
)

func words(text string) map[string]bool {
	m := map[string]bool{}
	for _, w := range strings.Fields(text) {
		m[w] = true
	}
	return m
}

func stTokens(text string) ([]stToken, error) {
	var list []stToken
	for {
		text = strings.TrimLeft(text, " \n")
		if strings.HasPrefix(text, "(*") {
			end := strings.Index(text, "*)")
			if end < 0 {
				return nil, fmt.Errorf("comment without end")
			}
			if strings.Contains(text[2:end], "(*") {
				return nil, fmt.Errorf("comment inside a comment: %s", text[:end])
			}
			text = text[end+2:]
			continue
		}
		if text == "" {
			return append(list, stToken{kind: "end"}), nil
		}
		m := stLex.FindStringSubmatch(text)
		switch {
		case m == nil:
			return nil, fmt.Errorf("unexpected %.20q", text)
		case m[1] != "":
			if strings.Contains(m[1], "__") || strings.HasSuffix(m[1], "_") {
				return nil, fmt.Errorf("identifier %s", m[1])
			}
			list = append(list, stToken{"word", strings.ToUpper(m[1])})
		case m[2] != "":
			list = append(list, stToken{"number", m[2]})
		default:
			list = append(list, stToken{"mark", m[3]})
		}
		text = text[len(m[0]):]
	}
}

// stNode is a statement or an expression: an operator or word with its parts.
type stNode struct {
	op    string
	name  string
	value float64
	parts []*stNode
}

type stVariable struct {
	name, kind, section string
	length              int // 0: no array
	initial             []float64
}

type stUnit struct {
	name      string
	variables []stVariable
	index     map[string]int
	body      []*stNode
}

type stParser struct {
	tokens []stToken
	unit   *stUnit
	blocks map[string]*stUnit // known function blocks
}

// parseST parses one file with one unit; blocks are those it may use.
func parseST(text string, blocks map[string]*stUnit) (unit *stUnit, err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("%v", r)
		}
	}()
	tokens, err := stTokens(text)
	if err != nil {
		return nil, err
	}
	p := &stParser{tokens: tokens, blocks: blocks, unit: &stUnit{index: map[string]int{}}}
	kind := p.oneOf("FUNCTION_BLOCK", "PROGRAM")
	p.unit.name = p.newName()
	for p.peek() == "VAR" || p.peek() == "VAR_INPUT" || p.peek() == "VAR_OUTPUT" {
		p.section()
	}
	p.unit.body = p.statements("END_" + kind)
	p.need("END_" + kind)
	if p.tokens[0].kind != "end" {
		return nil, fmt.Errorf("text after END_%s: %s", kind, p.peek())
	}
	return p.unit, nil
}

func (p *stParser) peek() string { return p.tokens[0].text }

func (p *stParser) take() stToken {
	t := p.tokens[0]
	if t.kind == "end" {
		panic("text ends early")
	}
	p.tokens = p.tokens[1:]
	return t
}

func (p *stParser) need(text string) {
	if t := p.take(); t.text != text {
		panic(fmt.Sprintf("%s where %s is needed", t.text, text))
	}
}

func (p *stParser) accept(text string) bool {
	if p.peek() == text {
		p.take()
		return true
	}
	return false
}

func (p *stParser) oneOf(texts ...string) string {
	t := p.take().text
	for _, x := range texts {
		if t == x {
			return t
		}
	}
	panic(fmt.Sprintf("%s where one of %v is needed", t, texts))
}

func (p *stParser) newName() string {
	t := p.take()
	if t.kind != "word" || stWords[t.text] {
		panic(fmt.Sprintf("%q is no name", t.text))
	}
	return t.text
}

// section reads one VAR block.
func (p *stParser) section() {
	section := p.take().text
	if p.accept("CONSTANT") {
		section = "CONSTANT"
	}
	for !p.accept("END_VAR") {
		v := stVariable{name: p.newName(), section: section}
		if _, ok := p.unit.index[v.name]; ok || v.name == p.unit.name {
			panic("declared twice: " + v.name)
		}
		p.need(":")
		if p.accept("ARRAY") {
			p.need("[")
			p.need("0")
			p.need("..")
			last, err := strconv.Atoi(p.take().text)
			if err != nil {
				panic(err)
			}
			v.length = last + 1
			p.need("]")
			p.need("OF")
		}
		v.kind = p.take().text
		if p.blocks[v.kind] == nil {
			switch v.kind {
			case "REAL", "LREAL", "BOOL", "DINT":
			default:
				panic("type " + v.kind)
			}
		}
		if p.accept(":=") {
			v.initial = p.initial(v)
		} else if section == "CONSTANT" {
			panic("constant without value: " + v.name)
		}
		p.need(";")
		p.unit.index[v.name] = len(p.unit.variables)
		p.unit.variables = append(p.unit.variables, v)
	}
}

func (p *stParser) initial(v stVariable) []float64 {
	if v.length == 0 {
		return []float64{p.literal(v.kind)}
	}
	p.need("[")
	list := []float64{p.literal(v.kind)}
	for p.accept(",") {
		list = append(list, p.literal(v.kind))
	}
	p.need("]")
	if len(list) != v.length {
		panic(fmt.Sprintf("%d values for %s of length %d", len(list), v.name, v.length))
	}
	return list
}

func (p *stParser) literal(kind string) float64 {
	sign := 1.0
	if p.accept("-") {
		sign = -1
	}
	t := p.take()
	isReal := kind == "REAL" || kind == "LREAL"
	if kind == "BOOL" {
		if t.text != "TRUE" && t.text != "FALSE" {
			panic("BOOL " + t.text)
		}
		return map[string]float64{"TRUE": 1}[t.text]
	}
	if t.kind != "number" || isReal != strings.Contains(t.text, ".") {
		panic(kind + " " + t.text)
	}
	x, err := strconv.ParseFloat(t.text, 64)
	if err != nil {
		panic(err)
	}
	return sign * x
}
