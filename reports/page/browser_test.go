package page

import (
	"bufio"
	"bytes"
	"encoding/base64"
	"encoding/json"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"
	"time"
)

// patience is how long the browser may take to answer: a busy machine under the
// race detector is slow, a hanging page is slower.
const patience = 90 * time.Second

// A tab is one page of a headless Chromium, driven over a pair of pipes with
// the DevTools protocol: JSON messages that end in a zero byte.
type tab struct {
	t       *testing.T
	in      *os.File
	session string
	next    int
	results chan message

	mu       sync.Mutex
	errors   []string // console errors, exceptions, dialogs
	requests []string
	events   chan string
}

type message struct {
	ID      int             `json:"id"`
	Method  string          `json:"method"`
	Params  json.RawMessage `json:"params"`
	Result  json.RawMessage `json:"result"`
	Session string          `json:"sessionId"`
	Error   *struct {
		Message string `json:"message"`
	} `json:"error"`
}

// chromium finds the browser; where CI=true it must be there.
func chromium(t *testing.T) string {
	t.Helper()
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if path, err := exec.LookPath(name); err == nil {
			return path
		}
	}
	if os.Getenv("CI") == "true" {
		t.Fatal("chromium is missing: install it where CI=true")
	}
	t.Skip("needs chromium")
	return ""
}

// newTab starts a browser of its own with an empty profile.
func newTab(t *testing.T) *tab {
	t.Helper()
	exe := chromium(t)
	toRead, toWrite, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	fromRead, fromWrite, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	profile := t.TempDir()
	cmd := exec.Command(exe, "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
		"--disable-component-update", "--disable-sync", "--hide-scrollbars", "--user-data-dir="+profile, "--remote-debugging-pipe", "about:blank")
	cmd.ExtraFiles = []*os.File{toRead, fromWrite} // 3 and 4
	cmd.Env = append(os.Environ(), "HOME="+profile)
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	toRead.Close()
	fromWrite.Close()
	b := &tab{t: t, in: toWrite, results: make(chan message, 16), events: make(chan string, 1024)}
	done := make(chan struct{})
	go func() {
		defer close(done)
		b.listen(fromRead)
	}()
	t.Cleanup(func() {
		b.session = ""
		b.send("Browser.close", nil)
		killer := time.AfterFunc(5*time.Second, func() { cmd.Process.Kill() })
		cmd.Wait()
		killer.Stop()
		toWrite.Close()
		<-done
		fromRead.Close()
		// Helpers of the browser may still be writing their last files.
		for range 50 {
			if os.RemoveAll(profile) == nil {
				break
			}
			time.Sleep(20 * time.Millisecond)
		}
	})
	var target struct{ TargetID string }
	b.call("Target.createTarget", map[string]any{"url": "about:blank"}, &target)
	var attached struct{ SessionID string }
	b.call("Target.attachToTarget", map[string]any{"targetId": target.TargetID, "flatten": true}, &attached)
	b.session = attached.SessionID
	for _, domain := range []string{"Page", "Runtime", "Log", "Network", "DOM", "Accessibility"} {
		b.call(domain+".enable", nil, nil)
	}
	return b
}

func (b *tab) send(method string, params any) int {
	b.next++
	m := map[string]any{"id": b.next, "method": method}
	if params != nil {
		m["params"] = params
	}
	if b.session != "" {
		m["sessionId"] = b.session
	}
	data, err := json.Marshal(m)
	if err != nil {
		b.t.Fatal(err)
	}
	b.in.Write(append(data, 0))
	return b.next
}

// call sends a command and waits for its result.
func (b *tab) call(method string, params, into any) {
	b.t.Helper()
	id := b.send(method, params)
	deadline := time.After(patience)
	for {
		select {
		case m := <-b.results:
			if m.ID != id {
				continue
			}
			if m.Error != nil {
				b.t.Fatalf("%s: %s", method, m.Error.Message)
			}
			if into != nil {
				if err := json.Unmarshal(m.Result, into); err != nil {
					b.t.Fatalf("%s: %v", method, err)
				}
			}
			return
		case <-deadline:
			b.t.Fatalf("%s: no answer in 20 s", method)
		}
	}
}

func (b *tab) listen(from *os.File) {
	r := bufio.NewReaderSize(from, 1<<20)
	for {
		data, err := r.ReadBytes(0)
		if err != nil {
			return
		}
		var m message
		if json.Unmarshal(bytes.TrimSuffix(data, []byte{0}), &m) != nil {
			continue
		}
		if m.ID > 0 {
			b.results <- m
			continue
		}
		b.mu.Lock()
		switch m.Method {
		case "Runtime.exceptionThrown", "Page.javascriptDialogOpening":
			b.errors = append(b.errors, m.Method+" "+string(m.Params))
		case "Runtime.consoleAPICalled", "Log.entryAdded":
			if bytes.Contains(m.Params, []byte(`"error"`)) || bytes.Contains(m.Params, []byte(`"warning"`)) {
				b.errors = append(b.errors, m.Method+" "+string(m.Params))
			}
		case "Network.requestWillBeSent":
			var p struct{ Request struct{ URL string } }
			if json.Unmarshal(m.Params, &p) == nil && !strings.HasPrefix(p.Request.URL, "data:") {
				b.requests = append(b.requests, p.Request.URL)
			}
		}
		b.mu.Unlock()
		select {
		case b.events <- m.Method:
		default:
		}
	}
}

// open shows a file and waits until it has loaded.
func (b *tab) open(path string) {
	b.t.Helper()
	for len(b.events) > 0 {
		<-b.events
	}
	b.call("Page.navigate", map[string]any{"url": "file://" + path}, nil)
	deadline := time.After(patience)
	for {
		select {
		case e := <-b.events:
			if e == "Page.loadEventFired" {
				return
			}
		case <-deadline:
			b.t.Fatal("the page does not load in 20 s")
		}
	}
}

// eval returns the value of an expression in the page.
func (b *tab) eval(expression string, into any) {
	b.t.Helper()
	var r struct {
		Result           struct{ Value json.RawMessage }
		ExceptionDetails json.RawMessage
	}
	b.call("Runtime.evaluate", map[string]any{"expression": expression, "returnByValue": true, "awaitPromise": true}, &r)
	if len(r.ExceptionDetails) > 0 {
		b.t.Fatalf("%s: %s", expression, r.ExceptionDetails)
	}
	if into == nil {
		return
	}
	if err := json.Unmarshal(r.Result.Value, into); err != nil {
		b.t.Fatalf("%s: %v in %s", expression, err, r.Result.Value)
	}
}

func (b *tab) text(expression string) string {
	b.t.Helper()
	var s string
	b.eval("String("+expression+")", &s)
	return s
}

func (b *tab) number(expression string) float64 {
	b.t.Helper()
	var x float64
	b.eval(expression, &x)
	return x
}

// keyCodes are the keys that the tests press.
var keyCodes = map[string]int{"Enter": 13, " ": 32, "ArrowLeft": 37, "ArrowUp": 38, "ArrowRight": 39, "ArrowDown": 40, "Tab": 9, "Home": 36, "End": 35}

func (b *tab) press(key string) {
	b.t.Helper()
	code := key
	if key == " " {
		code = "Space"
	}
	down := map[string]any{"type": "keyDown", "key": key, "code": code, "windowsVirtualKeyCode": keyCodes[key]}
	switch key {
	case "Enter":
		down["text"] = "\r"
	case " ":
		down["text"] = " "
	}
	b.call("Input.dispatchKeyEvent", down, nil)
	b.call("Input.dispatchKeyEvent", map[string]any{"type": "keyUp", "key": key, "code": code, "windowsVirtualKeyCode": keyCodes[key]}, nil)
}

func (b *tab) screen(width, height int) {
	b.call("Emulation.setDeviceMetricsOverride", map[string]any{"width": width, "height": height, "deviceScaleFactor": 1, "mobile": false}, nil)
}

// quiet fails when the page complained or reached out since the last look.
func (b *tab) quiet(path string) {
	b.t.Helper()
	b.mu.Lock()
	defer b.mu.Unlock()
	for _, e := range b.errors {
		b.t.Errorf("the page complains: %s", e)
	}
	for _, r := range b.requests {
		if r != "file://"+path && r != "about:blank" {
			b.t.Errorf("the page asks for %s", r)
		}
	}
	b.errors, b.requests = nil, nil
}

func saved(t *testing.T, page string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "design.html")
	if err := os.WriteFile(path, []byte(page), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// visible counts the elements that a selector finds and a reader can see.
func visible(selector string) string {
	return fmt.Sprintf(`Array.from(document.querySelectorAll(%q)).filter(e => e.getClientRects().length > 0).length`, selector)
}

func TestInABrowser(t *testing.T) {
	in := finished(t)
	page := write(t, in)
	path := saved(t, page)
	b := newTab(t)
	b.screen(1280, 900)
	b.open(path)
	b.quiet(path)

	t.Run("fits every width", func(t *testing.T) {
		for _, width := range []int{360, 600, 1280, 1920} {
			b.screen(width, 900)
			for _, corner := range []string{"0", "1"} {
				b.eval(`document.querySelector('input[name=corner-parts][value="`+corner+`"]').click()`, nil)
				if w := b.number("document.documentElement.scrollWidth"); int(w) > width {
					t.Errorf("at %d px the page is %g px wide; the widest: %s", width, w, widest(b))
				}
			}
			if n := b.number(`Array.from(document.querySelectorAll("figure > svg")).filter(e => e.getClientRects().length && e.getBoundingClientRect().width < 200).length`); n > 0 {
				t.Errorf("at %d px %g drawings are narrower than 200 px", width, n)
			}
		}
		b.screen(1280, 900)
		b.eval(`document.querySelector('input[name=corner-parts][value="0"]').click()`, nil)
	})

	t.Run("corner by keyboard", func(t *testing.T) {
		if n := b.number(visible(".period")); n != 1 {
			t.Fatalf("%g waveforms are shown", n)
		}
		b.eval(`document.querySelector('input[name=corner-waves]:checked').focus()`, nil)
		b.press("ArrowRight")
		if c := b.text("document.documentElement.dataset.corner"); c != "1" {
			t.Errorf("corner %s after the right arrow", c)
		}
		if s := b.text(`document.querySelector('input[name=corner-parts]:checked').value`); s != "1" {
			t.Errorf("the parts stay at corner %s", s)
		}
		if n := b.number(visible(".period")); n != 1 {
			t.Errorf("%g waveforms are shown", n)
		}
		if n := b.number(visible(".at.field")); n != 2 {
			t.Errorf("%g half sections are shown, one of each part expected", n)
		}
		b.press("ArrowLeft")
	})

	t.Run("cursor by keyboard and pointer", func(t *testing.T) {
		before := b.text(`document.querySelector(".readout").textContent`)
		if !strings.Contains(before, "resonant") || !strings.Contains(before, "mT") {
			t.Errorf("the cursor reads %q", before)
		}
		b.eval(`document.querySelector(".cursor input").focus()`, nil)
		b.press("End")
		last := b.text(`document.querySelector(".readout").textContent`)
		b.press("Home")
		// The period closes, so both ends read the same but for the time.
		first := b.text(`document.querySelector(".readout").textContent`)
		if first == last || first == before {
			t.Errorf("the cursor reads %q, %q, %q", before, first, last)
		}
		want := figuresOf(in.View.Corners[0].Resonant[0])
		if !strings.Contains(first, "resonant "+want+" A") {
			t.Errorf("at t = 0 the cursor reads %q, the resonant current is %s A", first, want)
		}
		b.eval(`(() => { const s = document.querySelector(".period svg"), r = s.getBoundingClientRect(); s.scrollIntoView({behavior: "instant"}); const q = s.getBoundingClientRect();
			s.dispatchEvent(new PointerEvent("pointermove", {clientX: q.left + q.width / 2, clientY: q.top + q.height / 3, bubbles: true})); })()`, nil)
		if now := b.text(`document.querySelector(".readout").textContent`); now == first {
			t.Error("the pointer does not move the cursor")
		}
		if x := b.number(`+document.querySelector(".cross").getAttribute("x1")`); !(x > 0) {
			t.Errorf("the cursor stands at %g", x)
		}
	})

	t.Run("sizes sort by keyboard", func(t *testing.T) {
		b.eval(`document.querySelector('#size-table button[data-by="loss"]').focus()`, nil)
		b.press("Enter")
		if s := b.text(`document.querySelector('#size-table button[data-by="loss"]').parentNode.getAttribute("aria-sort")`); s != "ascending" {
			t.Errorf("sorted %s", s)
		}
		order := func() []string {
			var list []string
			b.eval(`Array.from(document.querySelectorAll("#size-table tbody tr:not([hidden])")).map(r => r.dataset.part + " " + r.dataset.core)`, &list)
			return list
		}
		up := order()
		if up[0] != "inductor RM 8" || up[1] != "inductor PQ 20/16" || up[2] != "transformer PQ 40/40" {
			t.Errorf("by loss: %v", up)
		}
		b.press(" ")
		if down := order(); down[len(down)-1] != up[0] {
			t.Errorf("by loss, the other way: %v", down)
		}
		b.eval(`document.querySelector("#find").focus()`, nil)
		b.call("Input.insertText", map[string]any{"text": "rm"}, nil)
		if list := order(); len(list) != 2 {
			t.Errorf("found for rm: %v", list)
		}
		if s := b.text(`document.querySelector("#count").textContent`); !strings.HasPrefix(s, "2 of 9") {
			t.Errorf("the count says %q", s)
		}
		b.eval(`document.querySelector("#only-kept").focus()`, nil)
		b.press(" ")
		if list := order(); len(list) != 1 || list[0] != "inductor RM 8" {
			t.Errorf("kept and rm: %v", list)
		}
		b.press(" ")
		b.eval(`(() => { const f = document.querySelector("#find"); f.value = ""; f.dispatchEvent(new Event("input")); })()`, nil)
		b.eval(`(() => { const f = document.querySelector("#only-part"); f.value = "transformer"; f.dispatchEvent(new Event("change")); })()`, nil)
		if list := order(); len(list) != 6 {
			t.Errorf("transformers: %v", list)
		}
	})

	t.Run("sizes picked in the plot", func(t *testing.T) {
		b.eval(`document.querySelector('.sizes[data-part="inductor"] svg').focus()`, nil)
		b.press("End")
		if s := b.text(`document.querySelector('.sizes[data-part="inductor"] .tip').textContent`); !strings.HasPrefix(s, "RM 8, inductor: 6.09 cm³, 0.72 W") {
			t.Errorf("the last mark is %q", s)
		}
		b.press("Enter") // the row is filtered out: the filter gives way
		if s := b.text(`document.activeElement.id`); s != "size-8" {
			t.Errorf("the focus is on %q", s)
		}
		if n := b.number(`document.querySelectorAll("tr.picked").length`); n != 1 {
			t.Errorf("%g rows are picked", n)
		}
		b.eval(`document.querySelector('.sizes[data-part="pair"] svg').focus()`, nil)
		b.press("ArrowRight")
		if s := b.text(`document.querySelector('.sizes[data-part="pair"] .tip').textContent`); !strings.HasPrefix(s, "PQ 40/40 + RM 8: 65.7 cm³, 2.63 W, 153 g, chosen") {
			t.Errorf("the second pair is %q", s)
		}
		b.press(" ")
		if s := b.text(`document.activeElement.id`); s != "size-p1" {
			t.Errorf("the focus is on %q", s)
		}
		b.eval(`document.querySelector('.sizes[data-part="transformer"]').scrollIntoView({behavior: "instant"})`, nil)
		var at struct{ X, Y float64 }
		b.eval(`(() => { const r = document.querySelector('.mark[data-mark="3"]').getBoundingClientRect(); return {X: r.left + r.width / 2, Y: r.top + r.height / 2}; })()`, &at)
		for _, kind := range []string{"mouseMoved", "mousePressed", "mouseReleased"} {
			p := map[string]any{"type": kind, "x": at.X, "y": at.Y}
			if kind != "mouseMoved" {
				p["button"], p["clickCount"] = "left", 1
			}
			b.call("Input.dispatchMouseEvent", p, nil)
		}
		if s := b.text(`document.querySelector("tr.picked th").textContent`); s != "E 42/21/15" {
			t.Errorf("a click picks %q", s)
		}
	})

	t.Run("origins by keyboard", func(t *testing.T) {
		const shown = `Array.from(document.querySelectorAll(".origin:not([hidden]) summary small")).map(e => e.textContent)`
		list := func() (names []string) {
			b.eval(shown, &names)
			return names
		}
		opened := func() string {
			return b.text(`Array.from(document.querySelectorAll(".origin[open] summary")).map(e => e.id).join(" ")`)
		}
		if n := len(list()); n != len(in.Explanations) || opened() != "" {
			t.Errorf("%d figures, open: %q", n, opened())
		}
		b.eval(`document.querySelector("#find-figure").focus()`, nil)
		b.call("Input.insertText", map[string]any{"text": "Inductor loss"}, nil)
		if got := list(); len(got) != 2 || got[0] != "inductor.core_loss" || got[1] != "inductor.winding_loss" {
			t.Errorf("found for inductor loss: %v", got)
		}
		if s := b.text(`document.querySelector("#figure-count").textContent`); s != fmt.Sprintf("2 of %d figures", len(in.Explanations)) {
			t.Errorf("the count says %q", s)
		}
		if n := b.number(visible(".origin-group")); n != 1 {
			t.Errorf("%g groups are shown", n)
		}
		// Tab leads on to what was found, Enter and the space bar open and close it.
		b.press("Tab")
		if s := b.text("document.activeElement.id"); s != "from-inductor-core_loss" {
			t.Errorf("Tab leads to %q", s)
		}
		b.press("Enter")
		if s := opened(); s != "from-inductor-core_loss" {
			t.Errorf("Enter opens %q", s)
		}
		if n := b.number(`Array.from(document.querySelectorAll("#origin table")).filter(e => e.checkVisibility()).length`); n != 2 {
			t.Errorf("%g tables are shown", n)
		}
		for _, width := range []int{360, 1920} {
			b.screen(width, 900)
			b.eval(`document.querySelectorAll(".origin").forEach(d => { d.hidden = false; d.open = true; }); document.querySelectorAll(".origin-group").forEach(g => { g.hidden = false; })`, nil)
			if w := b.number("document.documentElement.scrollWidth"); int(w) > width {
				t.Errorf("with all open at %d px the page is %g px wide; the widest: %s", width, w, widest(b))
			}
		}
		b.screen(1280, 900)
		if n := pages(b); n > 6 {
			t.Errorf("%d printed pages with every origin open", n)
		}
		b.eval(`document.querySelectorAll(".origin").forEach(d => { d.open = false; })`, nil)
		b.press(" ")
		if s := opened(); s != "from-inductor-core_loss" {
			t.Errorf("the space bar opens %q", s)
		}
		b.press(" ")
		if s := opened(); s != "" {
			t.Errorf("the space bar leaves %q open", s)
		}
		// A figure of a card leads to its origin, filtered out or not.
		b.eval(`(() => { const f = document.querySelector("#find-figure"); f.value = "no such figure"; f.dispatchEvent(new Event("input")); })()`, nil)
		if n := len(list()); n != 0 {
			t.Errorf("%d figures match nothing", n)
		}
		b.eval(`document.querySelector('.facts a[href="#from-transformer-short_inductance"]').focus()`, nil)
		b.press("Enter")
		b.text(`new Promise(done => setTimeout(done, 50))`)
		if s := opened(); s != "from-transformer-short_inductance" {
			t.Errorf("the link opens %q", s)
		}
		if s := b.text("document.activeElement.id"); s != "from-transformer-short_inductance" {
			t.Errorf("the link leads to %q", s)
		}
		// Enter in the box opens the first that was found.
		b.eval(`document.querySelector("#find-figure").focus()`, nil)
		b.call("Input.insertText", map[string]any{"text": "swing"}, nil)
		b.press("Enter")
		if s := b.text("document.activeElement.id"); s != "from-tank-swing_time" {
			t.Errorf("Enter in the box leads to %q", s)
		}
		b.eval(`(() => { const f = document.querySelector("#find-figure"); f.value = ""; f.dispatchEvent(new Event("input")); document.querySelectorAll(".origin").forEach(d => { d.open = false; }); })()`, nil)
	})

	t.Run("dark and light", func(t *testing.T) {
		ground := func() string { return b.text(`getComputedStyle(document.body).backgroundColor`) }
		light := ground()
		b.eval(`document.querySelector("#tone").focus()`, nil)
		b.press("Enter")
		if ground() == light {
			t.Error("the button changes nothing")
		}
		b.press("Enter")
		if ground() != light {
			t.Error("the button does not lead back")
		}
		b.call("Emulation.setEmulatedMedia", map[string]any{"features": []map[string]string{{"name": "prefers-color-scheme", "value": "dark"}}}, nil)
		b.eval(`document.documentElement.removeAttribute("data-tone")`, nil)
		if ground() == light {
			t.Error("a dark system gets a light page")
		}
		b.call("Emulation.setEmulatedMedia", map[string]any{"features": []map[string]string{}}, nil)
	})

	t.Run("named for screen readers", func(t *testing.T) {
		var tree struct {
			Nodes []struct {
				Ignored    bool
				Role, Name struct{ Value any }
			}
		}
		b.call("Accessibility.getFullAXTree", nil, &tree)
		count := map[string]int{}
		for _, n := range tree.Nodes {
			role, _ := n.Role.Value.(string)
			if n.Ignored {
				continue
			}
			switch role {
			case "button", "slider", "radio", "checkbox", "combobox", "searchbox", "image", "img", "application", "link", "region", "heading":
				count[role]++
				if name, _ := n.Name.Value.(string); strings.TrimSpace(name) == "" {
					t.Errorf("a %s without a name", role)
				}
			}
		}
		if count["slider"] != 1 || count["radio"] != 8 || count["application"] != 3 || count["image"]+count["img"] < 8 || count["heading"] < 12 {
			t.Errorf("in the tree: %v", count)
		}
		// Headings step down one at a time.
		var levels []int
		b.eval(`Array.from(document.querySelectorAll("h1,h2,h3,h4")).filter(e => e.getClientRects().length).map(e => +e.tagName[1])`, &levels)
		for i := 1; i < len(levels); i++ {
			if levels[i] > levels[i-1]+1 {
				t.Errorf("heading %d jumps from level %d to %d", i, levels[i-1], levels[i])
			}
		}
		// Every focusable thing is reached by Tab, and the first leads past the bar.
		b.eval(`document.activeElement.blur()`, nil)
		var ids float64
		b.eval(`new Set(Array.from(document.querySelectorAll("[id]")).map(e => e.id)).size - document.querySelectorAll("[id]").length`, &ids)
		if ids != 0 {
			t.Errorf("%g ids are used twice", -ids)
		}
	})

	t.Run("on paper", func(t *testing.T) {
		if n := pages(b); n > 6 {
			t.Errorf("%d printed pages", n)
		}
		b.call("Emulation.setEmulatedMedia", map[string]any{"media": "print"}, nil)
		if n := b.number(visible(".bar")); n < 8 {
			t.Errorf("%g bars of loss are printed", n)
		}
		if n := b.number(visible(".topbar, .cursor, .filter, .chooser, .cross, .origin")); n != 0 {
			t.Errorf("%g controls are printed", n)
		}
		if n := b.number(visible("#origin .paper")); n != 1 {
			t.Errorf("%g notes on the origins are printed", n)
		}
		b.call("Emulation.setEmulatedMedia", map[string]any{"media": ""}, nil)
	})
	b.quiet(path)

	t.Run("without scripts", func(t *testing.T) {
		b.call("Emulation.setScriptExecutionDisabled", map[string]any{"value": true}, nil)
		b.open(path)
		if n := b.number(visible(".period")); n != 4 {
			t.Errorf("%g waveforms are shown, all four expected", n)
		}
		if n := b.number(visible(".needs-script")); n != 0 {
			t.Errorf("%g dead controls are shown", n)
		}
		if n := b.number(visible(".origin")); int(n) != len(in.Explanations) {
			t.Errorf("%g origins are shown", n)
		}
		b.call("Emulation.setScriptExecutionDisabled", map[string]any{"value": false}, nil)
		b.quiet(path)
	})

	t.Run("markup as text", func(t *testing.T) {
		path := saved(t, write(t, angry(t)))
		b.screen(360, 800)
		b.open(path)
		if s := b.text("document.title"); s != hostile {
			t.Errorf("the title is %q", s)
		}
		if s := b.text(`document.querySelector("h1").textContent`); s != hostile {
			t.Errorf("the heading is %q", s)
		}
		b.eval(`document.querySelector('input[name=corner-waves][value="1"]').click(); document.querySelector(".sizes svg").focus()`, nil)
		b.press("ArrowRight")
		if s := b.text("typeof window.hurt"); s != "undefined" {
			t.Error("a script of a name has run")
		}
		if w := b.number("document.documentElement.scrollWidth"); w > 360 {
			t.Errorf("long names make the page %g px wide: %s", w, widest(b))
		}
		if n := pages(b); n > 6 {
			t.Errorf("%d printed pages with long names", n)
		}
		b.quiet(path)
	})

	t.Run("many corners and sizes", func(t *testing.T) {
		path := saved(t, write(t, crowded(t)))
		b.screen(1920, 900)
		b.open(path)
		b.eval(`document.querySelector('input[name=corner-waves][value="7"]').click()`, nil)
		if n := b.number(visible(".period")); n != 1 {
			t.Errorf("%g waveforms of the eighth corner", n)
		}
		if n := pages(b); n > 6 {
			t.Errorf("%d printed pages with 8 corners, 160 sizes and 40 pairs", n)
		}
		b.quiet(path)
	})
}

// widest names the first elements that stick out to the right.
func widest(b *tab) string {
	b.t.Helper()
	return b.text(`Array.from(document.querySelectorAll("body *")).filter(e => e.getBoundingClientRect().right > innerWidth + 1 && !e.closest(".scroll") && !e.closest(".topbar ul") && !(e.ownerSVGElement)).slice(0, 4).map(e => e.tagName + "." + e.getAttribute("class") + " in " + e.parentNode.className).join(", ")`)
}

// crowded has twice the corners and as many sizes as the table has cores.
func crowded(t *testing.T) Input {
	in := finished(t)
	d := in.Design
	n := len(d.Operations)
	for i := range n {
		o := d.Operations[i]
		o.Corner.Name += " 2"
		d.Operations = append(d.Operations, o)
		c := in.View.Corners[i]
		c.Name += " 2"
		in.View.Corners = append(in.View.Corners, c)
		for p := range in.View.Parts {
			f := in.View.Parts[p].Fields[i]
			f.Corner += " 2"
			in.View.Parts[p].Fields = append(in.View.Parts[p].Fields, f)
		}
		c1 := d.Rating.Corners[i]
		c1.Name += " 2"
		d.Rating.Corners = append(d.Rating.Corners, c1)
		c2 := d.InductorRating.Corners[i]
		c2.Name += " 2"
		d.InductorRating.Corners = append(d.InductorRating.Corners, c2)
	}
	for _, v := range d.Verdicts {
		if v.Corner != "" {
			v.Corner += " 2"
			d.Verdicts = append(d.Verdicts, v)
		}
	}
	for i := range 37 {
		x := d.Pareto[0]
		x.Loss, x.Volume, x.Chosen = x.Loss-0.01*float64(i+1), x.Volume*(1+0.05*float64(i+1)), false
		d.Pareto = append(d.Pareto, x)
	}
	for i := 0; len(d.Ladder) < 160; i++ {
		s := d.Ladder[i%9]
		s.Chosen = false
		s.Shape += fmt.Sprintf(" no. %d", i)
		s.Volume *= 1 + 0.01*float64(i)
		s.Loss *= 1 + 0.01*float64(i)
		d.Ladder = append(d.Ladder, s)
	}
	return in
}

// figuresOf is a number as the cursor prints it.
func figuresOf(v float64) string {
	a := v
	if a < 0 {
		a = -a
	}
	digits := 3
	switch {
	case a >= 100:
		digits = 0
	case a >= 10:
		digits = 1
	case a >= 1:
		digits = 2
	}
	return strings.Replace(fmt.Sprintf("%.*f", digits, v), "-", "−", 1)
}

var pdfPage = regexp.MustCompile(`/Type\s*/Page\b`)

// pages prints and counts.
func pages(b *tab) int {
	b.t.Helper()
	var pdf struct{ Data string }
	b.call("Page.printToPDF", map[string]any{"preferCSSPageSize": true, "printBackground": true}, &pdf)
	data, err := base64.StdEncoding.DecodeString(pdf.Data)
	if err != nil {
		b.t.Fatal(err)
	}
	n := len(pdfPage.FindAll(data, -1))
	if n == 0 {
		b.t.Fatalf("no page in a PDF of %d bytes", len(data))
	}
	return n
}
