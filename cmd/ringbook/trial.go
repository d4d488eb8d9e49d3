package main

import (
	"github.com/spf13/cobra"
)

func trialCommand(a *app) *cobra.Command {
	return group("trial", "Log trials, list them, strike one",
		`  ringbook trial take --board winch-drive --revision B --network c --c 470p
  ringbook trial import trials.csv`,
		trialTake(a), trialEnter(a), trialImport(a), trialList(a), trialStrike(a))
}
