package main

import (
	"fmt"
	"runtime/debug"
	"strings"

	"github.com/spf13/cobra"
)

// version is the release of the program, tablesVersion that of the embedded
// tables; both are printed on every sheet.
const (
	version       = "0.1.0"
	tablesVersion = "2026-12"
)

const exitCodesHelp = `
Exit codes: 0 done; 1 ran, and a limit is missed; 2 usage; 3 input invalid;
4 could not read or write; 130 interrupted.`

func newRootCommand(env environment, started func()) *cobra.Command {
	root := &cobra.Command{
		Use:   "gapwright",
		Short: "From a settled resonant tank to a transformer and inductor a shop can wind",
		Long: `gapwright takes a settled resonant tank (series-LC or LLC: Lr, Cr, Lm, turns
ratio, operating corners) and chooses core, gap, turns and wire of the
transformer and of the resonant inductor, rates both at every corner, proves
that the tank still works with the parts as built, and writes the winding
sheets.

It proposes constructions under the assumptions it prints. It certifies
nothing: insulation between mains and user is a matter for the responsible
engineer and the standards that apply.
` + exitCodesHelp,
		Example: `  gapwright design --demo --out build
  gapwright new job.yaml && gapwright tank job.yaml
  gapwright design job.yaml --out parts`,
		Version:       version,
		SilenceErrors: true,
		SilenceUsage:  true,
	}
	root.SetVersionTemplate(versionText() + "\n")
	root.SetIn(env.stdin)
	root.SetOut(env.stdout)
	root.SetErr(env.stderr)
	root.CompletionOptions.HiddenDefaultCmd = true
	root.AddCommand(commands(env)...)
	markStarted(root, started)
	return root
}

// commands returns every command of the program, in the order of the help.
func commands(env environment) []*cobra.Command {
	return []*cobra.Command{
		newNewCommand(env),
		newTankCommand(env),
		newDesignCommand(env),
		newCompareCommand(env),
		newCheckCommand(env),
		newExplainCommand(env),
		newExportCommand(env),
		newYieldCommand(env),
		newSheetCommand(env),
		newReadbackCommand(env),
		newCoresCommand(env),
		newWiresCommand(env),
		newWindowCommand(env),
		newMaterialsCommand(env),
		newFitCommand(env),
		newSchemaCommand(env),
	}
}

func versionText() string {
	text := fmt.Sprintf("gapwright %s, tables %s", version, tablesVersion)
	if info, ok := debug.ReadBuildInfo(); ok {
		for _, s := range info.Settings {
			if s.Key == "vcs.revision" && len(s.Value) >= 12 {
				text += ", commit " + s.Value[:12]
			}
		}
		text += ", " + info.GoVersion
	}
	return text
}

// localeIsUTF8 follows the POSIX order of the locale variables.
func localeIsUTF8(getenv func(string) string) bool {
	for _, name := range []string{"LC_ALL", "LC_CTYPE", "LANG"} {
		if v := getenv(name); v != "" {
			v = strings.ToUpper(v)
			return strings.Contains(v, "UTF-8") || strings.Contains(v, "UTF8")
		}
	}
	return false
}
