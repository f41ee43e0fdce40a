package page

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/chromedp/chromedp"
	"github.com/chromedp/chromedp/kb"
)

// dark is Chromium as a reader has it whose system is dark.
var dark = chromedp.Flag("blink-settings", "preferredColorScheme=0")

// axe reads axe-core, an outside checker of accessibility (Deque, MPL-2.0, npm
// axe-core, pinned in .ci/node).
func axe(t *testing.T) string {
	t.Helper()
	folder := os.Getenv("NIGHTWRIGHT_NODE")
	if folder == "" {
		folder = filepath.Join("..", "..", "..", ".ci", "node")
	}
	text, err := os.ReadFile(filepath.Join(folder, "node_modules", "axe-core", "axe.min.js"))
	if err != nil {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("axe-core is not installed: run npm ci in .ci/node")
		}
		t.Skip("axe-core is not installed: run npm ci in .ci/node")
	}
	return string(text)
}

// breaches has axe-core look at the page for what breaks WCAG 2.1 A and AA.
func (e eye) breaches(source string) []string {
	e.t.Helper()
	if _, err := chromedp.Run(e.ctx, chromedp.Evaluate[bool](source+"; true")); err != nil {
		e.t.Fatal(err)
	}
	const run = `axe.run(document, {runOnly: ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa"]}).then((r) =>
		JSON.stringify(r.violations.flatMap((v) => v.nodes.slice(0, 4).map((n) => v.id + ": " + n.html.slice(0, 160) + " - " + n.failureSummary.replace(/\s+/g, " ")))))`
	text, err := chromedp.Run(e.ctx, chromedp.Evaluate[string](run, chromedp.EvalAwaitPromise))
	if err != nil {
		e.t.Fatal(err)
	}
	var out []string
	if err := json.Unmarshal([]byte(text), &out); err != nil {
		e.t.Fatal(err)
	}
	return out
}

// TestAccessible: nothing on the page, the report and a sheet breaks WCAG 2.1
// AA by axe-core's rules, on light paper and on dark.
func TestAccessible(t *testing.T) {
	source := axe(t)
	d := newDesk(t)
	d.run(lossOfC1)
	for name, more := range map[string][]chromedp.ExecAllocatorOption{"light": nil, "dark": {dark}} {
		ctx := browser(t, more...)
		e := open(t, d, ctx, true)
		e.js("document.querySelector('#lanes .lane').dispatchEvent(new KeyboardEvent('keydown', {key: 'ArrowRight'}))")
		e.js("document.querySelector('#lanes .lane').dispatchEvent(new KeyboardEvent('keydown', {key: 'Enter'}))")
		e.until("document.querySelector('#story-text table')")
		e.keep("page-" + name)
		for _, b := range e.breaches(source) {
			t.Errorf("page, %s: %s", name, b)
		}
		for _, path := range []string{"/report", "/sheet?telescope=C1&night=2027-03-09"} {
			e.do(path, chromedp.Navigate(d.URL+path))
			for _, b := range e.breaches(source) {
				t.Errorf("%s, %s: %s", path, name, b)
			}
		}
	}
}

// TestFits: nothing sticks out sideways on a small laptop, a tablet either way
// up, and a telephone.
func TestFits(t *testing.T) {
	d := newDesk(t)
	e := open(t, d, browser(t), false)
	if !strings.Contains(e.text("#locked"), "To look only") || e.number("document.getElementById('locked').hidden ? 1 : 0") != 0 {
		t.Error("without the key the page doesn't say that it is to look only")
	}
	if e.number("document.querySelector('#redo button').disabled ? 1 : 0") != 1 {
		t.Error("without the key the page offers to plan again")
	}
	for _, size := range [][2]int64{{1280, 800}, {1024, 768}, {768, 1024}, {390, 844}} {
		e.do("resize", chromedp.EmulateViewport(size[0], size[1]))
		e.until(fmt.Sprintf("innerWidth === %d && document.querySelector('#lanes svg').clientWidth <= %d", size[0], size[0]))
		if over := e.number("document.documentElement.scrollWidth - innerWidth"); over > 0 {
			who, _ := chromedp.Run(e.ctx, chromedp.Evaluate[string](`[...document.querySelectorAll("body *")].filter((x) => x.getBoundingClientRect().right > innerWidth + 0.5 && !x.closest(".scroll")).map((x) => x.tagName + "#" + x.id).slice(0, 6).join(" ")`))
			t.Errorf("%v: %.0f px stick out: %s", size, over, who)
		}
		e.keep(fmt.Sprintf("size-%d", size[0]))
	}
}

// TestKeyboardAlone goes through the page without a mouse: a night, an
// exposure, its story, a typed loss, planning again, throwing away.
func TestKeyboardAlone(t *testing.T) {
	d := newDesk(t)
	e := open(t, d, browser(t), true)
	e.do("the ribbon", chromedp.Focus("#ribbon"), chromedp.KeyEvent(kb.Home), chromedp.KeyEvent(kb.ArrowRight)) // Home, arrow right
	e.until("desk.night.night === '2027-03-09'")
	if got := e.text("#ribbon") + fmt.Sprint(e.number("Number(document.getElementById('ribbon').getAttribute('aria-valuenow'))")); !strings.HasSuffix(got, "1") {
		t.Errorf("the ribbon tells %q", got)
	}
	e.js("document.querySelector('.lane').focus()")
	e.do("an exposure", chromedp.KeyEvent(kb.ArrowRight), chromedp.KeyEvent(kb.Enter)) // arrow right, enter
	e.until("document.querySelector('#story-text b')?.textContent.includes('visits')")
	e.do("a typed loss", chromedp.Focus("#add-from"), chromedp.KeyEvent("2027-03-10T02:00Z"), chromedp.Focus("#add-to"), chromedp.KeyEvent("2027-03-10T05:00Z\r"))
	e.until("document.querySelectorAll('#marks li').length === 1")
	e.do("nonsense", chromedp.SetValue("#add-from", "soon"), chromedp.Focus("#add-to"), chromedp.KeyEvent("\r"))
	e.until("document.getElementById('trouble').textContent.includes('two instants in UTC')")
	e.do("plan again", chromedp.Focus("#redo-now"), chromedp.KeyEvent("2027-03-08T12:00Z\r"))
	e.until("!document.getElementById('trial').hidden && document.activeElement.id === 'trial-h'")
	e.js("document.querySelector('input[name=which][value=current]').click()")
	e.until("desk.which === 'current' && !document.getElementById('verdict').textContent.startsWith('on trial')")
	e.do("throw away", chromedp.Focus("#drop"), chromedp.KeyEvent("\r"))
	e.until("document.getElementById('trial').hidden && document.getElementById('trouble').textContent.startsWith('Thrown away')")
}

// TestHostileNamesInThePage: markup in a field's name stays text.
func TestHostileNamesInThePage(t *testing.T) {
	const bad = `<img src=x onerror=hurt()>`
	d := newDesk(t, "\nA1,", "\n"+bad+",")
	e := open(t, d, browser(t), false)
	e.js("window.hurt = () => { window.hurts = 1; }")
	e.js("document.getElementById('find').value = '" + bad + "'; document.getElementById('find').dispatchEvent(new Event('change'))")
	e.until("document.getElementById('story-h').textContent.includes('<img') && document.querySelector('#story-text b')")
	if e.number("(window.hurts ?? 0) + document.querySelectorAll('img').length") != 0 {
		t.Error("a name became markup")
	}
}
