package screen

import tea "github.com/charmbracelet/bubbletea"

// MapTick is what the clock sends when a map is due.
var MapTick tea.Msg = mapMsg{}
