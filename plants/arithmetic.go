package plants

import (
	"fmt"
	"math"
	"regexp"
	"strings"

	"github.com/expr-lang/expr/ast"
	"github.com/expr-lang/expr/conf"
	"github.com/expr-lang/expr/parser"
)

// Bounds on one expression.
const (
	maxExpression = 200 // characters
	maxNodes      = maxExpression
)

// arithmetic is a checked expression: numbers, parameters, + - * / ^ ** and
// the functions below. Nothing else in it can be evaluated.
type arithmetic struct{ root ast.Node }

var functions = map[string]func(float64) float64{
	"sqrt": math.Sqrt, "sin": math.Sin, "cos": math.Cos, "tan": math.Tan,
	"exp": math.Exp, "log": math.Log, "abs": math.Abs,
}

const arithmeticAllowed = "expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi"

var parameterName = regexp.MustCompile(`^[A-Za-z_][A-Za-z0-9_]*$`)

// keywords of the expression language that cannot name a parameter.
var keywords = map[string]bool{
	"pi": true, "in": true, "not": true, "and": true, "or": true, "true": true, "false": true, "nil": true,
	"let": true, "if": true, "else": true, "matches": true, "contains": true, "startsWith": true, "endsWith": true,
}

// reserved reports a name that arithmetic gives another meaning.
func reserved(name string) bool { return keywords[name] || functions[name] != nil }

// parseArithmetic checks text against the allowed nodes and the known names.
func parseArithmetic(text string, known map[string]bool) (a arithmetic, wrong, expected string) {
	if n := len([]rune(text)); n > maxExpression {
		return a, fmt.Sprintf("an expression of %d characters", n), fmt.Sprintf("expected at most %d", maxExpression)
	}
	// Comments of the expression language are refused: a//b would be a.
	if strings.ContainsAny(text, "#\"'`{}[];|?:\n") || strings.Contains(text, "//") || strings.Contains(text, "/*") {
		return a, "cannot read " + quoted(text), arithmeticAllowed
	}
	// Builtins are left out of the configuration: every call is then a plain
	// call, and only the names in functions pass the check.
	tree, err := parser.ParseWithConfig(text, &conf.Config{MaxNodes: maxNodes, DisableIfOperator: true})
	if err != nil {
		return a, "cannot read " + quoted(text), arithmeticAllowed
	}
	if wrong, expected = checkNode(tree.Node, known); wrong != "" {
		return a, wrong + " in " + quoted(text), expected
	}
	return arithmetic{tree.Node}, "", ""
}

func checkNode(n ast.Node, known map[string]bool) (wrong, expected string) {
	switch n := n.(type) {
	case *ast.IntegerNode, *ast.FloatNode:
		return "", ""
	case *ast.IdentifierNode:
		if n.Value == "pi" || known[n.Value] {
			return "", ""
		}
		return "unknown name " + quoted(n.Value), "expected one of [parameters] or a function: sqrt sin cos tan exp log abs pi"
	case *ast.UnaryNode:
		if n.Operator == "+" || n.Operator == "-" {
			return checkNode(n.Node, known)
		}
		return "operator " + quoted(n.Operator), arithmeticAllowed
	case *ast.BinaryNode:
		switch n.Operator {
		case "+", "-", "*", "/", "^", "**":
		default:
			return "operator " + quoted(n.Operator), arithmeticAllowed
		}
		if wrong, expected = checkNode(n.Left, known); wrong != "" {
			return wrong, expected
		}
		return checkNode(n.Right, known)
	case *ast.CallNode:
		return checkCall(n.Callee, n.Arguments, known)
	case *ast.BuiltinNode:
		return checkCall(&ast.IdentifierNode{Value: n.Name}, n.Arguments, known)
	}
	return "something that is no arithmetic", arithmeticAllowed
}

func checkCall(callee ast.Node, arguments []ast.Node, known map[string]bool) (wrong, expected string) {
	id, ok := callee.(*ast.IdentifierNode)
	if !ok || functions[id.Value] == nil {
		name := ""
		if ok {
			name = " " + quoted(id.Value)
		}
		return "unknown function" + name, arithmeticAllowed
	}
	if len(arguments) != 1 {
		return fmt.Sprintf("%s with %d arguments", id.Value, len(arguments)), "expected one argument"
	}
	return checkNode(arguments[0], known)
}

// eval computes a checked expression in float64; the result may be infinite or
// NaN.
func (a arithmetic) eval(values map[string]float64) float64 { return evalNode(a.root, values) }

func evalNode(n ast.Node, values map[string]float64) float64 {
	switch n := n.(type) {
	case *ast.IntegerNode:
		return float64(n.Value)
	case *ast.FloatNode:
		return n.Value
	case *ast.IdentifierNode:
		if n.Value == "pi" {
			return math.Pi
		}
		return values[n.Value]
	case *ast.UnaryNode:
		v := evalNode(n.Node, values)
		if n.Operator == "-" {
			return -v
		}
		return v
	case *ast.BinaryNode:
		l, r := evalNode(n.Left, values), evalNode(n.Right, values)
		switch n.Operator {
		case "+":
			return l + r
		case "-":
			return l - r
		case "*":
			return l * r
		case "/":
			return l / r
		default:
			return math.Pow(l, r)
		}
	case *ast.CallNode:
		return functions[n.Callee.(*ast.IdentifierNode).Value](evalNode(n.Arguments[0], values))
	case *ast.BuiltinNode:
		return functions[n.Name](evalNode(n.Arguments[0], values))
	}
	return math.NaN()
}
