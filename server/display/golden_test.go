package display

import (
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rimeline/sizing"
	"rimeline/views"
)

var update = flag.Bool("update", false, "write the golden files anew")

// TestGolden compares all that the example's answer, working and sheet say with
// testdata; read a change of these files as carefully as a change of code.
func TestGolden(t *testing.T) {
	d := readDesign(t, exampleFile)
	r := sizing.Size(d)
	for name, got := range map[string]string{
		"example-answer.txt":  answerText(NewAnswer(d, r)),
		"example-working.txt": workingText(NewWorking(d, r)),
		"example-sheet.txt":   sheetText(NewSheet(d, r)),
	} {
		file := filepath.Join("testdata", name)
		if *update {
			if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
				t.Fatal(err)
			}
			continue
		}
		want, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(string(want), got); diff != "" {
			t.Errorf("%s (-want +got; -update writes it anew):\n%s", name, diff)
		}
	}
}

// page writes a page struct as text, a line for each thing said.
type page struct{ strings.Builder }

func (p *page) line(format string, args ...any) {
	p.WriteString(strings.TrimRight(plain(fmt.Sprintf(format, args...)), " ") + "\n")
}

func (p *page) head(v views.Verdict, headline, tally string) {
	p.line("[%s] %s", v, headline)
	p.line("%s", tally)
}

func (p *page) rows(title string, rows []views.Row) {
	p.line("\n# %s", title)
	for _, r := range rows {
		p.line("%s | %s | %s", r.Name, r.Value, r.Note)
	}
}

func (p *page) steps(steps []views.Step) {
	for _, s := range steps {
		p.line("    %s = %s = %s = %s", s.Symbol, s.Expression, s.WithNumbers, s.Value)
	}
}

func (p *page) kinds(kinds []views.CheckKind) {
	for _, k := range kinds {
		p.line("\n## %s (%s). %s", k.Title, k.Verdict, k.Asks)
		for _, c := range k.Checks {
			p.line("%s [%s] %s. %s", c.Number, c.Verdict, c.About, strings.Join(append([]string{c.Sentence}, c.Reasons...), " "))
			p.steps(c.Steps)
			for _, note := range [][2]string{{"Shown", c.Shown}, {"Limit", c.Limit}, {"Clause", c.Cites}, {"Turns at", strings.Join(c.Turns, "; ")}} {
				if note[1] != "" {
					p.line("    %s: %s", note[0], note[1])
				}
			}
		}
		if k.Rest != "" {
			p.line("%s", k.Rest)
		}
	}
}

func (p *page) list(title string, all []string) {
	p.line("\n# %s", title)
	for _, s := range all {
		p.line("- %s", s)
	}
}

func (p *page) ceilings(all []views.Ceiling) {
	for _, c := range all {
		p.line("\n# Ceiling: %s", c.Where)
		for _, e := range c.Entries {
			p.line("%s | %s | %s | governs: %t", e.From, e.Value, e.Source, e.Governs)
		}
	}
}

func answerText(a views.Answer) string {
	var p page
	p.head(a.Verdict, a.Headline, a.Tally)
	p.line("\n# What fits")
	for _, f := range a.Fits {
		p.line("%s: %s. %s", f.Where, f.Range, strings.Join(f.Reasons, " "))
	}
	for _, c := range a.Charts {
		p.line("\n# %s. %s", c.Of, c.Says)
		p.line("line | %s | %s | %s", c.Cold, c.STC, c.Hot)
		for _, l := range c.Lines {
			p.line("%s | %s | %s | %s", l.Name, l.Cold, l.STC, l.Hot)
		}
		for _, l := range c.Levels {
			p.line("%s %s", l.Name, l.Value)
		}
	}
	p.kinds(a.Kinds)
	p.list("Coldest", a.Coldest)
	for _, c := range a.Cautions {
		p.line("! %s %s", c.Title, c.Text)
	}
	p.list("Not checked", a.NotChecked)
	return p.String()
}

func workingText(w views.WorkingPage) string {
	var p page
	p.line("%s", w.Title)
	p.head(w.Verdict, w.Headline, w.Tally)
	p.rows("Basis", w.Basis)
	p.line("%s", w.Rounding)
	p.ceilings(w.Ceilings)
	for _, l := range w.Limits {
		p.line("\n# %s: %s (%s)", l.Fit.Where, l.Fit.Range, l.Cites)
		p.steps(l.Steps)
	}
	p.kinds(w.Kinds)
	p.line("\n# Symbols")
	for _, s := range w.Symbols {
		p.line("%s: %s", s.Symbol, s.Meaning)
	}
	return p.String()
}

func sheetText(s views.SheetPage) string {
	var p page
	p.line("%s, %s. %s", s.Title, s.Site, s.Mark)
	p.head(s.Verdict, s.Headline, s.Tally)
	p.rows("Job", s.Job)
	p.line("\n# Schedule")
	for _, r := range s.Schedule {
		p.line("%s | %s | %s | %s | %s | %s × %s = %s | %s V | %s V | %s V | %s A | %s",
			r.Number, r.Plane, r.Faces, r.Inverter, r.Tracker, r.InSeries, r.Parallel, r.Modules, r.VocCold, r.VmpSTC, r.VmpHot, r.MaxCurrent, r.Verdict)
	}
	for _, r := range s.Totals {
		p.line("%s | %s | %s | %s | %s", r.Of, r.Strings, r.Modules, r.Power, r.Room)
	}
	p.line("%s", s.Reconciled)
	p.rows("Labels", s.Labels)
	for _, e := range s.Equipment {
		p.rows(e.Caption, e.Rows)
		p.line("not stated: %s", e.NotStated)
	}
	p.kinds(s.Governing)
	for _, c := range s.Cautions {
		p.line("! %s %s", c.Title, c.Text)
	}
	p.list("Not checked", s.NotChecked)
	p.list("Signatures", s.Signatures)
	return p.String()
}
