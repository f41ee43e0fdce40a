package page

import (
	"context"
	"net/http/httptest"
	"os"
	"testing"
	"time"

	"github.com/chromedp/chromedp"
)

// BenchmarkFirstView opens the page of the survey in NIGHTWRIGHT_SURVEY, which
// has a plan, in Chromium: until a night is shown, and then how many pictures a
// second the slider gives.
func BenchmarkFirstView(b *testing.B) {
	dir := os.Getenv("NIGHTWRIGHT_SURVEY")
	if dir == "" {
		if os.Getenv("NIGHTWRIGHT_REQUIRE_ALL") == "1" {
			b.Fatal("NIGHTWRIGHT_SURVEY names no survey")
		}
		b.Skip("NIGHTWRIGHT_SURVEY names no survey")
	}
	s, err := New(context.Background(), Config{Survey: dir, Workers: 2, Version: "test", Now: time.Now})
	if err != nil {
		b.Fatal(err)
	}
	defer s.Close()
	srv := httptest.NewServer(s.Handler())
	defer srv.Close()
	opts := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.NoSandbox, chromedp.DisableGPU, chromedp.WindowSize(1280, 800))
	ctx, cancel := chromedp.NewExecAllocator(b.Context(), opts...)
	defer cancel()
	ctx, cancel = chromedp.NewContext(ctx)
	defer cancel()
	const shown = "window.desk && desk.night && document.querySelectorAll('#lanes [data-field]').length > 0 ? performance.now() : 0"
	first, frames, n := 0.0, 0.0, 0
	for b.Loop() {
		if err := chromedp.Do(ctx, chromedp.Navigate(srv.URL)); err != nil {
			b.Fatal(err)
		}
		at := 0.0
		for at == 0 {
			if at, err = chromedp.Run(ctx, chromedp.Evaluate[float64](shown)); err != nil {
				b.Fatal(err)
			}
			time.Sleep(5 * time.Millisecond)
		}
		first += at
		rate, err := chromedp.Run(ctx, chromedp.Evaluate[float64](`new Promise((done) => {
			const m = document.getElementById("moment"), began = performance.now();
			let k = 0;
			const step = () => {
				m.value = Number(m.min) + (k / 120) * (m.max - m.min);
				m.dispatchEvent(new Event("input"));
				if (++k < 120) requestAnimationFrame(step); else done(120000 / (performance.now() - began));
			};
			step();
		})`, chromedp.EvalAwaitPromise))
		if err != nil {
			b.Fatal(err)
		}
		frames += rate
		n++
	}
	b.ReportMetric(first/float64(n), "ms/first-view")
	b.ReportMetric(frames/float64(n), "frames/s")
}
