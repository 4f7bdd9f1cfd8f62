package launch

import (
	"errors"
	"math/rand/v2"
	"os"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/screen"
	"polewright/ui/solver"
	"polewright/ui/study"
	"polewright/ui/survey"
	"polewright/ui/theme"
	"polewright/ui/wire"
)

// long is true where POLEWRIGHT_LONG=1 asks for the whole time.
func long() bool { return os.Getenv("POLEWRIGHT_LONG") == "1" }

// desktop is the screen with all its background work and no terminal. Its clock
// goes as the test says.
type desktop struct {
	t       *testing.T
	program *tea.Program
	clock   atomic.Int64 // ns
	asked   atomic.Uint64
	ended   chan error
	close   []func()

	mu       sync.Mutex
	more     *sync.Cond
	answered uint64
	answers  int
	maps     int
}

func sit(t *testing.T, name string) *desktop {
	t.Helper()
	b := desktest.Bench(t, name)
	_, list, _ := desktest.Start(t, b, estimator.Options{})
	d := &desktop{t: t, ended: make(chan error, 1)}
	d.more = sync.NewCond(&d.mu)
	d.clock.Store(1e18)
	sink, err := os.OpenFile(os.DevNull, os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = sink.Close() })
	ready := make(chan struct{})
	work := solver.New(b, func(a desk.Answer) {
		<-ready
		d.program.Send(screen.AnswerMsg{Answer: a})
		d.mu.Lock()
		d.answered = a.Gen
		d.answers++
		d.more.Broadcast()
		d.mu.Unlock()
	})
	student := study.New(b, func(a study.Answer) {
		<-ready
		d.program.Send(screen.StudyMsg{Answer: a})
	})
	surveyor := survey.New(b, func(a survey.Answer) {
		<-ready
		d.program.Send(screen.MapMsg{Answer: a})
		if a.Done {
			d.mu.Lock()
			d.maps++
			d.mu.Unlock()
		}
	})
	d.close = []func(){work.Close, student.Close, surveyor.Close}
	first := screen.New(screen.Config{
		Work: desk.Work{Bench: b, Poles: list},
		Ask: func(r desk.Request) {
			d.asked.Store(r.Gen)
			work.Ask(r)
		},
		Map:     surveyor.Ask,
		Study:   student.Ask,
		Save:    func(string, desk.Work, bool) error { return errors.New("no disk") },
		Resolve: aim.Resolver(b.Model),
		Theme:   theme.Options{},
		Now:     func() time.Time { return time.Unix(0, d.clock.Load()) },
		Width:   120, Height: 40,
	})
	d.program = tea.NewProgram(first, tea.WithInput(nil), tea.WithOutput(wire.New(sink)), tea.WithoutSignalHandler(),
		tea.WithFilter(func(_ tea.Model, msg tea.Msg) tea.Msg {
			if _, ok := msg.(tea.QuitMsg); ok && d.asked.Load() != leaving {
				return nil
			}
			return msg
		}))
	close(ready)
	go func() {
		_, err := d.program.Run()
		d.ended <- err
	}()
	return d
}

// leaving stands for a request that lets the program end.
const leaving = 1 << 62

// leave ends the program, which must still be there.
func (d *desktop) leave() {
	d.t.Helper()
	select {
	case err := <-d.ended:
		d.t.Fatalf("the program ended: %v", err)
	default:
	}
	d.asked.Store(leaving)
	d.program.Quit()
	select {
	case err := <-d.ended:
		if err != nil {
			d.t.Errorf("the program ended with %v", err)
		}
	case <-time.After(2 * time.Minute):
		d.t.Fatal("the program does not end")
	}
	for _, f := range d.close {
		f()
	}
}

// answer waits until what was asked for last is answered.
func (d *desktop) answer() {
	d.t.Helper()
	late := time.AfterFunc(20*time.Second, func() {
		d.mu.Lock()
		d.answered = leaving
		d.more.Broadcast()
		d.mu.Unlock()
	})
	defer late.Stop()
	d.mu.Lock()
	defer d.mu.Unlock()
	for d.answered < d.asked.Load() {
		d.more.Wait()
	}
	if d.answered == leaving {
		d.t.Fatal("no answer")
	}
}

// rest takes the next pole and rests until its map of the plane has come whole.
func (d *desktop) rest() {
	d.t.Helper()
	d.mu.Lock()
	before := d.maps
	d.mu.Unlock()
	d.program.Send(tea.KeyMsg{Type: tea.KeyTab})
	for range 1000 {
		d.clock.Add(int64(time.Second))
		d.mu.Lock()
		now := d.maps
		d.mu.Unlock()
		if now > before {
			return
		}
		time.Sleep(20 * time.Millisecond)
	}
	d.t.Fatal("no map")
}

// hold holds a key for some repeats, and lets it go.
func (d *desktop) hold(key tea.KeyType, n int) {
	for range n {
		d.clock.Add(int64(33 * time.Millisecond))
		d.program.Send(tea.KeyMsg{Type: key})
	}
	d.clock.Add(int64(time.Second))
}

// heap is what is in use after everything else was given back.
func heap() uint64 {
	runtime.GC()
	runtime.GC()
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return m.HeapAlloc
}

// settles waits until there are no more goroutines than before.
func settles(t *testing.T, before int, when string) {
	t.Helper()
	for range 200 {
		if runtime.NumGoroutine() <= before {
			return
		}
		time.Sleep(20 * time.Millisecond)
	}
	buf := make([]byte, 1<<16)
	t.Errorf("%s: %d goroutines, %d before\n%s", when, runtime.NumGoroutine(), before, buf[:runtime.Stack(buf, true)])
}

// A drag of half an hour, 30 keys a second, keeps neither memory nor goroutines.
// Short by default; POLEWRIGHT_LONG=1 makes all of its 54,000 steps.
func TestALongDragKeepsNothing(t *testing.T) {
	steps := 1200
	if long() {
		steps = 54000
	}
	before := runtime.NumGoroutine()
	d := sit(t, "lift")
	const each = 20
	drag := func(steps int) {
		for i := range steps / each {
			d.hold([]tea.KeyType{tea.KeyLeft, tea.KeyUp, tea.KeyRight, tea.KeyDown}[i%4], each)
			d.answer()
			if i%30 == 29 {
				d.rest()
			}
		}
	}
	drag(600) // caches fill, workspaces grow
	warm, threads := heap(), runtime.NumGoroutine()
	drag(steps)
	after := heap()
	settles(t, threads, "while it runs")
	d.mu.Lock()
	t.Logf("%d steps, %d answers, %d maps: %d kB in use, %d kB before, %d goroutines", steps, d.answers, d.maps, after>>10, warm>>10, runtime.NumGoroutine())
	if d.answers < steps/each {
		t.Errorf("only %d answers", d.answers)
	}
	d.mu.Unlock()
	// Each stroke is a step of undo and keeps its design: 1 kB.
	if most := warm + 1<<20 + uint64(steps/each)*2500; after > most {
		t.Errorf("%d kB in use, %d kB before", after>>10, warm>>10)
	}
	d.leave()
	settles(t, before, "at the end")
}

// Whatever is typed, pasted, clicked and resized, the program goes on while all of
// its background works; what the race detector is for. POLEWRIGHT_LONG=1 goes on for
// ten minutes.
func TestAnythingAtOnce(t *testing.T) {
	length := 2 * time.Second
	if long() {
		length = 10 * time.Minute
	}
	before := runtime.NumGoroutine()
	for i, name := range []string{"lift", "balancer"} {
		d := sit(t, name)
		random := rand.New(rand.NewPCG(3, uint64(i)))
		keys, others := 0, 0
		for end := time.Now().Add(length / 2); time.Now().Before(end); {
			if msg := anything(random); msg != nil {
				others++
				d.program.Send(msg)
			}
			for range random.IntN(8) {
				keys++
				d.clock.Add(random.Int64N(int64(400 * time.Millisecond)))
				d.program.Send(anyKey(random))
			}
		}
		t.Logf("%s: %d keys, %d pastes, clicks and resizes", name, keys, others)
		if keys < 20 {
			t.Errorf("%s: only %d keys", name, keys)
		}
		d.leave()
	}
	settles(t, before, "at the end")
}

var (
	special = []tea.KeyType{tea.KeyTab, tea.KeyShiftTab, tea.KeyLeft, tea.KeyRight, tea.KeyUp, tea.KeyDown, tea.KeyShiftLeft, tea.KeyShiftRight,
		tea.KeyEnter, tea.KeyEsc, tea.KeyBackspace, tea.KeyCtrlR, tea.KeyCtrlS, tea.KeyCtrlC, tea.KeyPgUp, tea.KeyPgDown, tea.KeyHome, tea.KeyEnd, tea.KeyDelete, tea.KeyF1}
	pastes = []string{"q\ny\n-3±2i", "\x1b[2J\x1b]0;x\a", "", strings.Repeat("-1, ", 5000), "漢字\u202e\u0000", "=-5\r"}
)

func anyKey(random *rand.Rand) tea.KeyMsg {
	if random.IntN(3) == 0 {
		return tea.KeyMsg{Type: special[random.IntN(len(special))]}
	}
	letter := rune('!' + random.IntN('~'-'!'))
	return tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune{letter}, Alt: random.IntN(20) == 0}
}

// anything is a paste, a click, a drag of the mouse or a resize; nil for nothing.
func anything(random *rand.Rand) tea.Msg {
	switch random.IntN(8) {
	case 0:
		return tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(pastes[random.IntN(len(pastes))]), Paste: true}
	case 1:
		return tea.WindowSizeMsg{Width: random.IntN(220), Height: random.IntN(70)}
	case 2:
		return tea.WindowSizeMsg{Width: 120, Height: 40}
	case 3, 4:
		return tea.MouseMsg{X: random.IntN(130), Y: random.IntN(45), Action: tea.MouseAction(random.IntN(3)), Button: tea.MouseButton(random.IntN(6))}
	}
	return nil
}
