package app

import (
	"fmt"
	"io"
	"math"
	"os"
	"sync"
	"time"

	"github.com/schollz/progressbar/v3"
	"golang.org/x/term"
)

// isTerminal says whether w is a terminal that understands more than plain
// lines.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd())) && os.Getenv("TERM") != "dumb"
}

// wantsColour says whether colours may be written to w: only on a terminal,
// and not where NO_COLOR is set to anything.
func wantsColour(w io.Writer) bool {
	return isTerminal(w) && os.Getenv("NO_COLOR") == ""
}

// A meter shows how far a command is. update may be called from several
// goroutines; stop must be called once, before anything else is written to
// the same stream.
type meter struct {
	mu    sync.Mutex
	w     io.Writer
	bar   *progressbar.ProgressBar // nil where lines are written
	quiet bool
	now   func() time.Time
	start time.Time // of the first report
	last  time.Time // when a line was last written
	done  bool
}

// lineEvery is the time between two lines where there is no terminal.
const lineEvery = 5 * time.Second

// barUnits is the resolution of the bar.
const barUnits = 10000

// newMeter shows progress on w: a bar on a terminal, a line every few seconds
// elsewhere, nothing when quiet.
func newMeter(w io.Writer, quiet bool) *meter {
	m := &meter{w: w, quiet: quiet, now: time.Now}
	if !quiet && isTerminal(w) {
		m.bar = newBar(w)
	}
	return m
}

// newBar is the bar of a terminal. The words behind it are the meter's.
func newBar(w io.Writer) *progressbar.ProgressBar {
	return progressbar.NewOptions64(barUnits,
		progressbar.OptionSetWriter(w),
		progressbar.OptionSetWidth(28),
		progressbar.OptionSetTheme(progressbar.Theme{Saucer: "━", SaucerHead: "╸", SaucerPadding: " ", BarStart: "│", BarEnd: "│"}),
		progressbar.OptionSetPredictTime(false),
		progressbar.OptionSetElapsedTime(false),
		progressbar.OptionShowDescriptionAtLineEnd(),
		progressbar.OptionThrottle(100*time.Millisecond),
	)
}

// update reports that done of total work units are done. Total may grow.
func (m *meter) update(stage string, done, total float64) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.quiet || m.done || !(total > 0) || math.IsNaN(done) {
		return
	}
	now := m.now()
	if m.start.IsZero() {
		m.start, m.last = now, now
	}
	part := min(max(done/total, 0), 1)
	text := stage + timing(now.Sub(m.start), part)
	if m.bar != nil {
		// The library takes a full bar for the end, but the work may grow
		// yet: the last unit is never given. It writes to a terminal only,
		// and there is nobody to tell when that fails.
		m.bar.Describe(text)
		_ = m.bar.Set64(min(int64(part*barUnits), barUnits-1))
		return
	}
	if now.Sub(m.last) >= lineEvery {
		m.last = now
		fmt.Fprintf(m.w, "nullmark: %3.0f %%, %s\n", math.Floor(100*part), text)
	}
}

// stop takes the bar away.
func (m *meter) stop() {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.bar != nil && !m.done && !m.start.IsZero() {
		// The library clears what it has drawn, but not the ^C that the
		// terminal has put behind it.
		fmt.Fprint(m.w, "\r\x1b[K")
	}
	m.done = true
}

// timing says how much time is gone and how much is probably left, assuming
// that the rest goes as fast as what is done. It promises nothing before two
// seconds and one percent.
func timing(gone time.Duration, part float64) string {
	text := ", " + roughly(gone) + " gone"
	if gone >= 2*time.Second && part >= 0.01 {
		left := time.Duration(float64(gone) * (1 - part) / part)
		text += ", about " + roughly(left) + " left"
	}
	return text
}

// roughly writes a duration with the precision a waiting reader wants.
func roughly(d time.Duration) string {
	s := int(math.Round(d.Seconds()))
	switch {
	case s < 120:
		return fmt.Sprintf("%d s", s)
	case s < 2*3600:
		return fmt.Sprintf("%d min %02d s", s/60, s%60)
	default:
		return fmt.Sprintf("%d h %02d min", s/3600, s/60%60)
	}
}
