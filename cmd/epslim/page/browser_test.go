package page

import (
	"context"
	"flag"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"
)

var screenshots = flag.String("screenshots", "", "write pictures of the example page into this folder")

// openBrowser starts a browser, or skips the test when none is installed.
func openBrowser(t *testing.T) context.Context {
	t.Helper()
	var path string
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome", "google-chrome-stable", "chrome"} {
		if p, err := exec.LookPath(name); err == nil {
			path = p
			break
		}
	}
	if path == "" {
		t.Skip("no chromium or chrome is installed: the page is NOT checked in a browser")
	}
	opts := append(chromedp.DefaultExecAllocatorOptions[:], chromedp.ExecPath(path), chromedp.NoSandbox, chromedp.DisableGPU,
		chromedp.UserDataDir(t.TempDir()))
	alloc, stop := chromedp.NewExecAllocator(context.Background(), opts...)
	t.Cleanup(stop)
	ctx, cancel := chromedp.NewContext(alloc)
	t.Cleanup(cancel)
	if err := chromedp.Do(ctx); err != nil {
		t.Fatalf("the browser does not start: %v", err)
	}
	return ctx
}

// tab opens a tab that is closed at the end of the test.
func tab(t *testing.T, browser context.Context) context.Context {
	t.Helper()
	ctx, cancel := chromedp.NewContext(browser)
	t.Cleanup(cancel)
	if err := chromedp.Do(ctx); err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithTimeout(ctx, time.Minute)
	t.Cleanup(stop)
	return ctx
}

// TestInABrowser looks at the example page in one browser, a tab for each question.
func TestInABrowser(t *testing.T) {
	browser := openBrowser(t)
	url := writePage(t, exampleDocument(t))
	for _, c := range []struct {
		name string
		test func(t *testing.T, ctx context.Context, url string)
	}{{"layout", testLayout}, {"columns are aligned", testColumns}, {"copy button", testCopyButton},
		{"without script", testWithoutScript}, {"print", testPrint}} {
		t.Run(c.name, func(t *testing.T) { c.test(t, tab(t, browser), url) })
	}
}

func writePage(t *testing.T, d *Document) (url string) {
	t.Helper()
	html, err := d.HTML()
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "page.html")
	if err := os.WriteFile(path, html, 0o644); err != nil {
		t.Fatal(err)
	}
	return "file://" + path
}

// complaints collects what the browser has to say against a page.
type complaints struct {
	mu   sync.Mutex
	text []string
}

func (c *complaints) listen(t *testing.T, ctx context.Context) {
	t.Helper()
	err := chromedp.Listen(ctx, func(ev any) {
		c.mu.Lock()
		defer c.mu.Unlock()
		switch e := ev.(type) {
		case *runtime.EventConsoleAPICalled:
			c.text = append(c.text, fmt.Sprintf("console %s", e.Type))
		case *runtime.EventExceptionThrown:
			c.text = append(c.text, "exception "+e.ExceptionDetails.Text)
		case *log.EventEntryAdded:
			c.text = append(c.text, e.Entry.Text)
		}
	})
	if err != nil {
		t.Fatal(err)
	}
}

func (c *complaints) check(t *testing.T) {
	t.Helper()
	c.mu.Lock()
	defer c.mu.Unlock()
	for _, s := range c.text {
		t.Errorf("the browser complains: %s", s)
	}
}

// measurements is what the page says of itself.
type measurements struct {
	Scroll, Client int      // widths of the document and of the window
	Wide           []string // elements that stick out of the window and are in no box that scrolls
	Maths          int
	Flat           []string // formulas without a size
	Background     string
	Ink            string
	Headings       []int
	Missing        []string // links within the page that lead nowhere
	Buttons        int
}

const measure = `(() => {
  const wide = [], flat = [];
  document.querySelectorAll("main *").forEach(e => {
    if (e.closest(".scroll, pre, svg, .away") && !e.matches(".scroll, pre")) return;
    const r = e.getBoundingClientRect();
    if (r.right > document.documentElement.clientWidth + 0.5 || r.left < -0.5) wide.push(e.tagName + "." + e.className);
  });
  const maths = document.querySelectorAll("math");
  maths.forEach(m => { const r = m.getBoundingClientRect(); if (r.width < 2 || r.height < 4) flat.push(m.textContent.slice(0, 60)); });
  document.querySelectorAll("mi, mn, mo, mfrac, msup, msub, msqrt").forEach(m => {
    if (/^[\u2061\u2062]?$/.test(m.textContent)) return;
    const r = m.getBoundingClientRect(); if (r.width <= 0 || r.height <= 0) flat.push(m.tagName + " " + m.textContent); });
  return {
    Scroll: document.documentElement.scrollWidth, Client: document.documentElement.clientWidth, Wide: wide,
    Maths: maths.length, Flat: flat,
    Background: getComputedStyle(document.body).backgroundColor, Ink: getComputedStyle(document.querySelector("svg .ink-fill") || document.body).fill,
    Headings: Array.from(document.querySelectorAll("h1,h2,h3,h4,h5,h6"), h => +h.tagName[1]),
    Missing: Array.from(document.querySelectorAll("a[href^='#']")).filter(a => !document.getElementById(decodeURIComponent(a.hash.slice(1)))).map(a => a.hash),
    Buttons: document.querySelectorAll(".formula button").length
  };
})()`

// command is a command of the protocol as an action.
func command[P, R any](c cdp.Command[P, R], params P) chromedp.Action[chromedp.Void] {
	return chromedp.Func(func(ctx context.Context, t *chromedp.Target) error {
		_, err := cdp.Call(ctx, t, c, params)
		return err
	})
}

func colourScheme(name string) chromedp.Action[chromedp.Void] {
	return command(emulation.SetEmulatedMedia, emulation.SetEmulatedMediaParams{
		Features: []*emulation.MediaFeature{{Name: "prefers-color-scheme", Value: name}}})
}

// run runs an action that returns a value.
func run[T any](t *testing.T, ctx context.Context, a chromedp.Action[T]) T {
	t.Helper()
	v, err := chromedp.Run(ctx, a)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func do(t *testing.T, ctx context.Context, steps ...chromedp.Action[chromedp.Void]) {
	t.Helper()
	if err := chromedp.Do(ctx, steps...); err != nil {
		t.Fatal(err)
	}
}

func testLayout(t *testing.T, ctx context.Context, url string) {
	t.Helper()
	var c complaints
	c.listen(t, ctx)
	for _, scheme := range []string{"light", "dark"} {
		for _, width := range []int64{1200, 400} {
			do(t, ctx, command(log.Enable, cdp.Empty{}), colourScheme(scheme), chromedp.EmulateViewport(width, 900), chromedp.Navigate(url))
			m := run(t, ctx, chromedp.Evaluate[measurements](measure))
			if *screenshots != "" {
				shot := run(t, ctx, chromedp.FullScreenshot(100))
				if err := os.WriteFile(filepath.Join(*screenshots, fmt.Sprintf("page-%s-%d.png", scheme, width)), shot, 0o644); err != nil {
					t.Fatal(err)
				}
			}
			checkMeasurements(t, fmt.Sprintf("%s at %d pixels", scheme, width), scheme, m)
		}
	}
	c.check(t)
}

func checkMeasurements(t *testing.T, name, scheme string, m measurements) {
	t.Helper()
	if m.Scroll > m.Client {
		t.Errorf("%s: the page is %d pixels wide in a window of %d", name, m.Scroll, m.Client)
	}
	if len(m.Wide) > 0 {
		t.Errorf("%s: outside of the window: %v", name, m.Wide)
	}
	if m.Maths != 6 {
		t.Errorf("%s: %d formulas, want 6", name, m.Maths)
	}
	if len(m.Flat) > 0 {
		t.Errorf("%s: formulas without a size: %q", name, m.Flat)
	}
	if m.Buttons != 2 {
		t.Errorf("%s: %d buttons for 2 formulas", name, m.Buttons)
	}
	if len(m.Missing) > 0 {
		t.Errorf("%s: links that lead nowhere: %v", name, m.Missing)
	}
	for i, h := range m.Headings {
		if i == 0 && h != 1 || i > 0 && (h < 2 || h > m.Headings[i-1]+1) {
			t.Errorf("%s: headings of levels %v", name, m.Headings)
			break
		}
	}
	bg, ink := "rgb(255, 255, 255)", "rgb(0, 0, 0)"
	if scheme == "dark" {
		bg, ink = "rgb(23, 25, 28)", "rgb(228, 228, 224)"
	}
	if m.Background != bg || m.Ink != ink {
		t.Errorf("%s: background %s and figure text %s, want %s and %s", name, m.Background, m.Ink, bg, ink)
	}
}

func testColumns(t *testing.T, ctx context.Context, url string) {
	t.Helper()
	type sides struct{ Rights, Lefts []float64 }
	const js = `({Rights: Array.from(document.querySelectorAll("mtd.right > :last-child"), e => e.getBoundingClientRect().right),
	  Lefts: Array.from(document.querySelectorAll("mtd.left > :first-child"), e => e.getBoundingClientRect().left)})`
	do(t, ctx, chromedp.Navigate(url))
	edges := run(t, ctx, chromedp.Evaluate[sides](js))
	if len(edges.Rights) != 3 || len(edges.Lefts) != 3 {
		t.Fatalf("%d and %d cells, want 3 and 3", len(edges.Rights), len(edges.Lefts))
	}
	for k := range edges.Rights {
		if d := edges.Rights[k] - edges.Rights[0]; d > 0.6 || d < -0.6 {
			t.Errorf("the left-hand sides end at %v", edges.Rights)
		}
		if d := edges.Lefts[k] - edges.Lefts[0]; d > 0.6 || d < -0.6 {
			t.Errorf("the right-hand sides begin at %v", edges.Lefts)
		}
	}
}

func testCopyButton(t *testing.T, ctx context.Context, url string) {
	t.Helper()
	// The script writes to the clipboard of the browser; here a stand-in takes the text down.
	const watch = `navigator.clipboard.writeText = s => { window.taken = s; return Promise.resolve(); }; 0`
	do(t, ctx, chromedp.Navigate(url))
	run(t, ctx, chromedp.Evaluate[int](watch))
	do(t, ctx, chromedp.Click(chromedp.CSS(".formula button")), chromedp.Sleep(200*time.Millisecond))
	if word := run(t, ctx, chromedp.Evaluate[string](`document.querySelector(".formula button").textContent`)); word != "copied" {
		t.Errorf("the button says %q, want \"copied\"", word)
	}
	if got := run(t, ctx, chromedp.Evaluate[string](`window.taken`)); got != generatorFormula().TeX {
		t.Errorf("copied %q, want %q", got, generatorFormula().TeX)
	}
}

func testWithoutScript(t *testing.T, ctx context.Context, url string) {
	t.Helper()
	do(t, ctx, command(emulation.SetScriptExecutionDisabled, emulation.SetScriptExecutionDisabledParams{Value: true}),
		chromedp.EmulateViewport(400, 900), chromedp.Navigate(url))
	m := run(t, ctx, chromedp.Evaluate[measurements](measure))
	text := run(t, ctx, chromedp.Text(chromedp.CSS("main")))
	if m.Buttons != 0 || m.Maths != 6 || m.Scroll > m.Client || !strings.Contains(text, "All checks hold") {
		t.Errorf("without the script: %d buttons, %d formulas, %d pixels wide, text %.200q", m.Buttons, m.Maths, m.Scroll, text)
	}
}

func testPrint(t *testing.T, ctx context.Context, url string) {
	t.Helper()
	do(t, ctx, colourScheme("dark"), chromedp.Navigate(url))
	pdf := run(t, ctx, chromedp.PrintToPDF(chromedp.PDFPreferCSSPageSize(), chromedp.PDFPrintBackground()))
	if !strings.HasPrefix(string(pdf), "%PDF") {
		t.Fatal("not a PDF")
	}
	if *screenshots != "" {
		if err := os.WriteFile(filepath.Join(*screenshots, "page.pdf"), pdf, 0o644); err != nil {
			t.Fatal(err)
		}
	}
}
