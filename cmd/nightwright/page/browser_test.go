package page

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/chromedp/cdproto/input"
	"github.com/chromedp/chromedp"
	"github.com/chromedp/chromedp/kb"
)

// browser starts Chromium, with more of its options where they are given.
func browser(t *testing.T, more ...chromedp.ExecAllocatorOption) context.Context {
	t.Helper()
	if testing.Short() && os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") != "1" { // the race detector gains nothing from a browser
		t.Skip("-short")
	}
	path := ""
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if p, err := exec.LookPath(name); err == nil {
			path = p
			break
		}
	}
	if path == "" {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			t.Fatal("no chromium in the path")
		}
		t.Skip("no chromium in the path")
	}
	opts := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(path), chromedp.NoSandbox, chromedp.DisableGPU, chromedp.WindowSize(1280, 800))
	opts = append(opts, more...)
	ctx, cancel := chromedp.NewExecAllocator(t.Context(), opts...)
	t.Cleanup(cancel)
	ctx, cancel = chromedp.NewContext(ctx)
	t.Cleanup(cancel)
	ctx, cancel = context.WithTimeout(ctx, 3*time.Minute)
	t.Cleanup(cancel)
	return ctx
}

// eye is a browser on the page.
type eye struct {
	t   *testing.T
	ctx context.Context
}

func (e eye) do(what string, steps ...chromedp.Action[chromedp.Void]) {
	e.t.Helper()
	if err := chromedp.Do(e.ctx, steps...); err != nil {
		e.t.Fatalf("%s: %v", what, err)
	}
}

// until waits for a JavaScript expression to be true.
func (e eye) until(expression string) {
	e.t.Helper()
	for range 600 {
		ok, err := chromedp.Run(e.ctx, chromedp.Evaluate[bool]("Boolean("+expression+")"))
		if err == nil && ok {
			return
		}
		time.Sleep(50 * time.Millisecond)
	}
	e.t.Fatalf("it never came true: %s; trouble: %s", expression, e.text("#trouble"))
}

func (e eye) text(sel string) string {
	e.t.Helper()
	s, err := chromedp.Run(e.ctx, chromedp.Evaluate[string](fmt.Sprintf("document.querySelector(%q)?.textContent ?? ''", sel)))
	if err != nil {
		e.t.Fatal(err)
	}
	return s
}

// number evaluates an expression.
func (e eye) number(expression string) float64 {
	e.t.Helper()
	x, err := chromedp.Run(e.ctx, chromedp.Evaluate[float64](expression))
	if err != nil {
		e.t.Fatalf("%s: %v", expression, err)
	}
	return x
}

// js runs a statement.
func (e eye) js(statement string) {
	e.t.Helper()
	if _, err := chromedp.Run(e.ctx, chromedp.Evaluate[bool](statement+"; true")); err != nil {
		e.t.Fatalf("%s: %v", statement, err)
	}
}

// keep writes a screenshot where NIGHTWRIGHT_SHOTS says, for people to look at.
func (e eye) keep(name string) {
	e.t.Helper()
	dir := os.Getenv("NIGHTWRIGHT_SHOTS")
	if dir == "" {
		return
	}
	b, err := chromedp.Run(e.ctx, chromedp.CaptureScreenshot())
	if err != nil {
		e.t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(dir, name+".png"), b, 0o644); err != nil {
		e.t.Fatal(err)
	}
}

// open opens the page and waits until it shows a night.
func open(t *testing.T, d *desk, ctx context.Context, key bool) eye {
	t.Helper()
	e := eye{t, ctx}
	address := d.URL + "/"
	if key {
		address += "#key=" + testKey
	}
	e.do("open", chromedp.Navigate(address))
	e.until("window.desk && desk.night && document.querySelectorAll('#lanes [data-field]').length > 0")
	return e
}

// TestPlannersDay drives the page as a planner does: look, ask a field, mark a
// loss by dragging, plan again, look at what would change, accept, reload.
func TestPlannersDay(t *testing.T) {
	d := newDesk(t)
	e := open(t, d, browser(t), true)
	if got := e.text("#verdict"); !strings.Contains(got, "coverage 0.") {
		t.Errorf("the verdict: %q", got)
	}
	if e.number("location.hash.length") != 0 {
		t.Error("the key stays in the address")
	}
	e.do("choose a night", chromedp.Focus("#ribbon"), chromedp.KeyEvent(kb.Home)) // Home
	e.until("desk.night.night === '2027-03-08'")
	e.do("the next night", chromedp.Click("#later"))
	e.until("desk.night.night === '2027-03-09' && document.querySelector('#night-h').textContent.includes('2027-03-09')")

	// The slider moves the sky.
	const picture = "[...document.getElementById('dome').toDataURL()].reduce((h, c) => (h * 31 + c.charCodeAt(0)) % 1e9, 7)"
	before := e.number(picture)
	e.js("(m => { m.value = Number(m.min) + 0.6 * (m.max - m.min); m.dispatchEvent(new Event('input')); })(document.getElementById('moment'))")
	e.until(fmt.Sprintf("%s !== %d", picture, int64(before)))

	// An exposure tells its field's story.
	x := e.number("(r => r.left + r.width / 2)(document.querySelector('#lanes [data-field]').getBoundingClientRect())")
	y := e.number("(r => r.top + r.height / 2)(document.querySelector('#lanes [data-field]').getBoundingClientRect())")
	e.do("click an exposure", chromedp.MouseClickXY(x, y))
	e.until("document.querySelector('#story-text b')?.textContent.includes('visits')")
	e.js("document.querySelector('#story-text button').click()")
	e.until("document.querySelector('#story-text h3')?.textContent.includes('visits')")
	e.keep("story")

	// Drag a loss over most of the lane, plan again.
	lane := "(document.querySelectorAll('.lane')[0].querySelector('.edge').getBoundingClientRect())"
	x0, x1, yl := e.number("(r => r.left + 3)"+lane), e.number("(r => r.right - 3)"+lane), e.number("(r => r.top + r.height / 2)"+lane)
	e.do("drag", chromedp.MouseEvent(input.DispatchMouseEventTypeMousePressed, x0, yl, chromedp.ButtonLeft, chromedp.ClickCount(1)),
		chromedp.MouseEvent(input.DispatchMouseEventTypeMouseMoved, (x0+x1)/2, yl, chromedp.ButtonLeft), chromedp.MouseEvent(input.DispatchMouseEventTypeMouseMoved, x1, yl, chromedp.ButtonLeft),
		chromedp.MouseEvent(input.DispatchMouseEventTypeMouseReleased, x1, yl, chromedp.ButtonLeft, chromedp.ClickCount(1)))
	e.until("document.querySelectorAll('#marks li').length === 1 && document.querySelectorAll('#lanes .mark').length === 1")
	files := d.files()
	e.do("nothing moves before", chromedp.SetValue("#redo-now", "2027-03-08T12:00Z"), chromedp.SetValue("#redo-hold", "0"))
	e.do("plan again", chromedp.Click("#redo button"))
	e.until("!document.getElementById('trial').hidden && desk.which === 'trial' && document.querySelectorAll('#trial-table tbody tr').length === 5")
	e.keep("trial")
	if fmt.Sprint(files) != fmt.Sprint(d.files()) {
		t.Error("something was written before it was accepted")
	}
	e.do("accept", chromedp.Click("#accept"))
	e.until("document.getElementById('trial').hidden && desk.which === 'current' && document.querySelector('#trouble').textContent.startsWith('Accepted')")
	e.do("reload", chromedp.Reload())
	e.until("window.desk && desk.night && document.querySelectorAll('#marks li').length === 0")
	e.js("(x => { x.value = '2027-03-09'; x.dispatchEvent(new Event('change')); })(document.getElementById('date'))")
	e.until("desk.night.night === '2027-03-09' && document.querySelectorAll('.lane')[0].querySelectorAll('[data-field]').length === 0 && document.querySelectorAll('#lanes .lost').length === 1")
	e.keep("accepted")
}
