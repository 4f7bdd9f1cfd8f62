package theme

// Glyphs are the characters of the screen, each one cell wide. Marks differ in
// shape, so that none needs a colour. A circle would be read as a zero: the trade
// marks zeros so.
type Glyphs struct {
	Target, Selected, Fixed, Plant, Controller, Floor rune

	Rule, Vertical, Cross, Dot, Limit rune
	Left, Right, Up, Down             rune // at the edge: further out that way
	Event                             rune // on the time axis
	Cursor                            rune
	Ellipsis                          rune

	// Grain is what stands for the shades where they are no colours: the pattern of
	// even and of odd rows, four cells long. Hatch is a stroke of hatching.
	Grain [Shades][2][4]rune
	Hatch rune

	Truth    Line
	Estimate Line
	Band     rune

	PlusMinus, AtMost, AtLeast, Undefined, Infinite, Middle, Sigma, Arrows string
}

// Line is what a trace is drawn with.
type Line struct {
	Horizontal, Vertical, DownRight, DownLeft, UpRight, UpLeft, Start, End string
	Sample                                                                 string // three cells, for the key
}

var unicode = Glyphs{
	Target: '□', Selected: '●', Fixed: '■', Plant: '×', Controller: '△', Floor: '◇',
	Rule: '─', Vertical: '│', Cross: '┼', Dot: '·', Limit: '╌',
	Left: '◂', Right: '▸', Up: '▴', Down: '▾', Event: '!', Cursor: '▏', Ellipsis: '…',
	Grain: [Shades][2][4]rune{{{' ', ' ', ' ', ' '}, {' ', ' ', ' ', ' '}}, {{'░', ' ', ' ', ' '}, {' ', ' ', '░', ' '}}, {{'░', ' ', '░', ' '}, {' ', '░', ' ', '░'}}, {{'░', '░', '░', '░'}, {'░', '░', '░', '░'}}, {{'▒', '░', '▒', '░'}, {'░', '▒', '░', '▒'}}}, Hatch: '╱',
	Truth:     Line{"─", "│", "╭", "╮", "╰", "╯", "╶", "╴", "───"},
	Estimate:  Line{"•", "•", "•", "•", "•", "•", "•", "•", "•••"},
	Band:      '┄',
	PlusMinus: "±", AtMost: "≤", AtLeast: "≥", Undefined: "–", Infinite: "∞", Middle: " · ", Sigma: "σ", Arrows: "←↓↑→",
}

var ascii = Glyphs{
	Target: 'w', Selected: '@', Fixed: '#', Plant: 'x', Controller: 'c', Floor: '*',
	Rule: '-', Vertical: '|', Cross: '+', Dot: '.', Limit: '=',
	Left: '<', Right: '>', Up: '^', Down: 'v', Event: '!', Cursor: '_', Ellipsis: '~',
	Grain: [Shades][2][4]rune{{{' ', ' ', ' ', ' '}, {' ', ' ', ' ', ' '}}, {{',', ' ', ' ', ' '}, {' ', ' ', ',', ' '}}, {{',', ' ', ',', ' '}, {' ', ',', ' ', ','}}, {{':', ' ', ':', ' '}, {' ', ':', ' ', ':'}}, {{':', ':', ':', ':'}, {':', ':', ':', ':'}}}, Hatch: '%',
	Truth:     Line{"-", "|", ".", ".", "'", "'", "-", "-", "---"},
	Estimate:  Line{"*", "*", "*", "*", "*", "*", "*", "*", "***"},
	Band:      '~',
	PlusMinus: "+-", AtMost: "<=", AtLeast: ">=", Undefined: "-", Infinite: "inf", Middle: ", ", Sigma: "sigma", Arrows: "hjkl",
}
