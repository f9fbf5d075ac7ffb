package tests

import (
	"context"
	_ "embed"
	"errors"
	"flag"
	"fmt"
	"net"
	"net/url"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/chromedp/cdproto/cdp"
	"github.com/chromedp/cdproto/emulation"
	"github.com/chromedp/cdproto/input"
	"github.com/chromedp/cdproto/log"
	"github.com/chromedp/cdproto/network"
	"github.com/chromedp/cdproto/page"
	"github.com/chromedp/cdproto/runtime"
	"github.com/chromedp/chromedp"

	"rimeline/server"
)

var screenshots = flag.String("screenshots", "", "a folder to put a picture of every page into, seen from tests/")

// patience is how long a step in the browser may take before the test gives it up.
// It is a limit for a hung browser, not a measure of speed.
const patience = 30 * time.Second

// viewport is a size of screen.
type viewport struct {
	name          string
	width, height int64
}

var (
	desk   = viewport{"desk", 1280, 900}
	phone  = viewport{"phone", 360, 740}
	narrow = viewport{"narrow", 320, 640}
)

// chrome is the browser of this test run: one process, started by the first test
// that needs it and ended by TestMain.
var chrome struct {
	start  sync.Once
	ctx    context.Context
	cancel context.CancelFunc
	err    error
}

func TestMain(m *testing.M) {
	flag.Parse()
	status := m.Run()
	if chrome.cancel != nil {
		chrome.cancel()
	}
	removeProgram()
	os.Exit(status)
}

// findBrowser returns the path of a Chromium.
func findBrowser() (string, error) {
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome", "google-chrome-stable"} {
		if p, err := exec.LookPath(name); err == nil {
			return p, nil
		}
	}
	return "", fmt.Errorf("no Chromium found; on Debian: apt-get install chromium")
}

// needBrowser returns the context of the browser. A machine without one skips the
// test, so that go test ./... passes on a fresh clone; the full run (CI=true) must
// have one.
func needBrowser(t *testing.T) context.Context {
	t.Helper()
	if testing.Short() || raceDetector {
		t.Skip("tests in the browser are for the full run")
	}
	exe, err := findBrowser()
	if err != nil && os.Getenv("CI") != "true" {
		t.Skip(err)
	}
	if err != nil {
		t.Fatal(err)
	}
	chrome.start.Do(func() { chrome.ctx, chrome.cancel, chrome.err = startBrowser(exe) })
	if chrome.err != nil {
		t.Fatalf("start %s: %v", exe, chrome.err)
	}
	return chrome.ctx
}

// startBrowser starts a browser of its own. Its context ends with cancel.
func startBrowser(exe string, more ...chromedp.ExecAllocatorOption) (ctx context.Context, cancel func(), err error) {
	options := append(chromedp.DefaultExecAllocatorOptions[:],
		chromedp.ExecPath(exe), chromedp.NoSandbox, chromedp.DisableGPU,
		chromedp.Flag("disable-quic", true),
		chromedp.Flag("disable-component-update", true),
		chromedp.Flag("force-device-scale-factor", "1"))
	allocator, endAllocator := chromedp.NewExecAllocator(context.Background(), append(options, more...)...)
	ctx, endBrowser := chromedp.NewContext(allocator)
	err = chromedp.Do(ctx) // starts it
	return ctx, func() { endBrowser(); endAllocator() }, err
}

// startSite serves the site on a free port of this machine until the test ends and
// returns its address, as http://127.0.0.1:12345.
func startSite(t *testing.T) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithCancel(context.WithoutCancel(t.Context()))
	ended := make(chan error, 1)
	go func() { ended <- server.New(server.Config{StopTimeout: time.Second}).Serve(ctx, l) }()
	t.Cleanup(func() {
		stop()
		<-ended
	})
	return "http://" + l.Addr().String()
}

// tab is a page in the browser. What the browser complains of while it is open, such
// as a broken content policy, an uncaught exception, a request to another host,
// fails the test.
type tab struct {
	t      *testing.T
	ctx    context.Context
	close  func()
	site   string
	script bool

	mu         sync.Mutex
	requests   []string // method and path of each request to the site, in order
	complaints []string
	bytes      int64 // received, headers included, since the last open
}

// openTab opens an empty tab for the site. With script false the pages run none.
func openTab(t *testing.T, site string, size viewport, script bool) *tab {
	t.Helper()
	return openTabOf(t, needBrowser(t), site, size, script)
}

// openTabOf opens an empty tab of a browser.
func openTabOf(t *testing.T, browser context.Context, site string, size viewport, script bool) *tab {
	t.Helper()
	ctx, cancel := chromedp.NewContext(browser)
	t.Cleanup(cancel)
	b := &tab{t: t, ctx: ctx, close: cancel, site: site, script: script}
	if err := errors.Join(chromedp.Do(ctx), chromedp.Listen(ctx, b.observe)); err != nil { // the first Do must have no time limit
		t.Fatal(err)
	}
	b.do(
		chromedp.EmulateViewport(size.width, size.height),
		command(network.Enable, network.EnableParams{}),
		command(network.SetCacheDisabled, network.SetCacheDisabledParams{CacheDisabled: true}),
		command(log.Enable, cdp.Empty{}),
		command(emulation.SetScriptExecutionDisabled, emulation.SetScriptExecutionDisabledParams{Value: !script}),
	)
	t.Cleanup(func() {
		for _, c := range b.takeComplaints() {
			t.Errorf("the browser complains: %s", c)
		}
	})
	return b
}

// in runs fn with the tab's failures counted to a subtest.
func (b *tab) in(t *testing.T, fn func()) {
	outer := b.t
	b.t = t
	defer func() { b.t = outer }()
	fn()
}

// observe is called for every event of the tab, in order.
func (b *tab) observe(event any) {
	b.mu.Lock()
	defer b.mu.Unlock()
	switch e := event.(type) {
	case *network.EventRequestWillBeSent:
		u, err := url.Parse(e.Request.URL)
		if err != nil || u.Scheme == "http" && "http://"+u.Host != b.site || u.Scheme == "https" {
			b.complaints = append(b.complaints, "a request to another host: "+e.Request.URL)
			return
		}
		if u.Scheme == "http" {
			b.requests = append(b.requests, e.Request.Method+" "+u.Path)
		}
	case *network.EventLoadingFinished:
		b.bytes += int64(e.EncodedDataLength)
	case *runtime.EventExceptionThrown:
		text := e.ExceptionDetails.Text
		if x := e.ExceptionDetails.Exception; x != nil {
			text += " " + x.Description
		}
		b.complaints = append(b.complaints, "uncaught: "+text)
	case *log.EventEntryAdded:
		// An answer of 4xx is logged too; the tests ask for some on purpose.
		if e.Entry.Level == log.EntryLevelError && e.Entry.Source != log.EntrySourceNetwork {
			b.complaints = append(b.complaints, e.Entry.Text)
		}
	}
}

// do runs steps that return nothing.
func (b *tab) do(steps ...chromedp.Action[chromedp.Void]) {
	b.t.Helper()
	ctx, cancel := context.WithTimeout(b.ctx, patience)
	defer cancel()
	if err := chromedp.Do(ctx, steps...); err != nil {
		b.t.Fatal(err)
	}
}

// ask runs a step that returns a value.
func ask[T any](b *tab, step chromedp.Action[T]) T {
	b.t.Helper()
	ctx, cancel := context.WithTimeout(b.ctx, patience)
	defer cancel()
	value, err := chromedp.Run(ctx, step)
	if err != nil {
		b.t.Fatal(err)
	}
	return value
}

// eval returns the value of an expression in the page.
func eval[T any](b *tab, expression string) T {
	b.t.Helper()
	return ask(b, chromedp.Evaluate[T](expression, chromedp.EvalAwaitPromise))
}

// command is a command of the browser's protocol as a step.
func command[P, R any](c cdp.Command[P, R], params P) chromedp.Action[chromedp.Void] {
	return chromedp.Func(func(ctx context.Context, t *chromedp.Target) error {
		_, err := cdp.Call(ctx, t, c, params)
		return err
	})
}

// open goes to a page of the site by its path.
func (b *tab) open(path string) {
	b.t.Helper()
	b.mu.Lock()
	b.bytes, b.requests = 0, nil
	b.mu.Unlock()
	b.do(chromedp.Navigate(b.site + path))
}

// leave clicks what leads to another page and waits until that is there.
func (b *tab) leave(selector string) {
	b.t.Helper()
	ask(b, chromedp.WaitEvent(page.LoadEventFired, nil, chromedp.Click(chromedp.CSS(selector))))
}

// press sends keys to the element that has the focus, as a keyboard would.
func (b *tab) press(keys string) {
	b.t.Helper()
	b.do(chromedp.KeyEvent(keys))
}

// enter presses the Enter key. Its events are sent one by one, as a window system
// does: an element that acts on the first of them keeps the second from the element
// to which it moves the focus.
func (b *tab) enter() {
	b.t.Helper()
	for _, kind := range []input.DispatchKeyEventType{
		input.DispatchKeyEventTypeRawKeyDown, input.DispatchKeyEventTypeChar, input.DispatchKeyEventTypeKeyUp,
	} {
		b.do(command(input.DispatchKeyEvent, input.DispatchKeyEventParams{
			Type: kind, Key: "Enter", Code: "Enter", Text: "\r", WindowsVirtualKeyCode: 13, NativeVirtualKeyCode: 13,
		}))
	}
}

// wait waits until an expression in the page is true. An error is no end of it: the
// page may be making way for the next one.
func (b *tab) wait(expression string) {
	b.t.Helper()
	ctx, cancel := context.WithTimeout(b.ctx, patience)
	defer cancel()
	last := "false"
	for {
		ok, err := chromedp.Run(ctx, chromedp.Evaluate[bool](expression))
		switch {
		case ctx.Err() != nil:
			b.t.Fatalf("waited %s for %s; it was %s", patience, expression, last)
		case err != nil:
			last = err.Error()
		case ok:
			return
		default:
			last = "false"
		}
		time.Sleep(20 * time.Millisecond)
	}
}

// sent returns the requests since the last open, as "POST /design".
func (b *tab) sent() []string {
	b.mu.Lock()
	defer b.mu.Unlock()
	return slices.Clone(b.requests)
}

// picture keeps a picture of the whole page, where -screenshots asks for them.
func (b *tab) picture(name string) {
	b.t.Helper()
	if *screenshots == "" {
		return
	}
	png := ask(b, chromedp.FullScreenshot(100))
	if err := os.MkdirAll(*screenshots, 0o755); err != nil {
		b.t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(*screenshots, name+".png"), png, 0o644); err != nil {
		b.t.Fatal(err)
	}
}

// axe is axe-core, which finds what keeps people out of a page. Its licence stands
// beside it.
//
//go:embed testdata/axe/axe.min.js
var axe string

// barriers returns each fault that axe-core finds in the page: WCAG 2.2 up to AA, and
// what its makers call best practice.
func (b *tab) barriers() []string {
	b.t.Helper()
	// axe-core itself needs script; it is let in after the page was loaded without.
	b.do(command(emulation.SetScriptExecutionDisabled, emulation.SetScriptExecutionDisabledParams{Value: false}))
	defer func() {
		b.do(command(emulation.SetScriptExecutionDisabled, emulation.SetScriptExecutionDisabledParams{Value: !b.script}))
	}()
	b.do(chromedp.Evaluate[chromedp.Void](axe))
	return eval[[]string](b, `axe.run(document, {resultTypes: ["violations"], rules: {"target-size": {enabled: true}}}).then(r => r.violations.map(v =>
		v.impact + ": " + v.help + " (" + v.id + ")" + v.nodes.map(n => "\n\t" + n.html.slice(0, 200) + "\n\t\t" + n.failureSummary).join("")))`)
}

// beyondTheEdge returns the first elements that stand beyond the screen's edge, if
// the page has to be scrolled sideways.
func (b *tab) beyondTheEdge() []string {
	b.t.Helper()
	return eval[[]string](b, `(() => {
		const edge = document.documentElement.clientWidth
		if (document.documentElement.scrollWidth <= edge) return []
		return [...document.querySelectorAll("body *")].filter(e => e.getBoundingClientRect().right > edge + 1)
			.slice(0, 5).map(e => e.outerHTML.slice(0, 120))
	})()`)
}

// sound fails the test for what a page must never have, whatever it is for.
func (b *tab) sound() {
	b.t.Helper()
	for _, fault := range b.barriers() {
		b.t.Errorf("axe-core, %s", fault)
	}
	if beyond := b.beyondTheEdge(); len(beyond) > 0 {
		b.t.Errorf("the page has to be scrolled sideways; beyond the edge are:\n\t%s", strings.Join(beyond, "\n\t"))
	}
	for _, c := range b.takeComplaints() {
		b.t.Errorf("the browser complains: %s", c)
	}
}

// takeComplaints returns what the browser complained of since it was last asked.
func (b *tab) takeComplaints() []string {
	b.mu.Lock()
	defer b.mu.Unlock()
	taken := b.complaints
	b.complaints = nil
	return taken
}
