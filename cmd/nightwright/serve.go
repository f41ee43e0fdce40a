package main

import (
	"crypto/rand"
	"encoding/hex"
	"errors"
	"fmt"
	"net"
	"strconv"
	"syscall"
	"time"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/page"
	"nightwright/cmd/nightwright/work"
)

func (a *app) serveCommand() *cobra.Command {
	var plan, listen string
	var port int
	var hosts []string
	c := a.command("serve SURVEY", 0, &cobra.Command{
		Short: "the planning page, on this machine",
		Long: `Serves the planning page on 127.0.0.1 until it is interrupted: pick a night, see
every telescope's lane and the sky at each moment, ask a field for its story,
mark lost time, plan again, look at what would move, and accept it or throw it
away. Nothing is written before that. The page's jobs are those of the commands,
its state is the survey folder and its ledger.

The address that is printed ends in a key. Who has it may change the plan; who
opens the page without it may look. /openapi.json describes what programs can
ask for, /vis and /obsplan answer in VOTable.

--listen says another address than 127.0.0.1. Then everyone who reaches that
address can look, and the key travels unencrypted: put a server with TLS and
passwords before it.`,
		Example: `  nightwright serve mysurvey
  nightwright serve mysurvey --plan tonight --port 8500
  nightwright serve mysurvey --listen 10.0.0.5 --host planner.local`,
	}, func(cmd *cobra.Command, args []string) error {
		if port < 0 || port > 65535 {
			return work.Inputf("--port is %d; want 0 to 65535", port)
		}
		if net.ParseIP(listen) == nil {
			return work.Inputf("--listen is %q; want an address of this machine, such as 127.0.0.1", listen)
		}
		secret := make([]byte, 16)
		if _, err := rand.Read(secret); err != nil {
			return err
		}
		cfg := page.Config{Survey: args[0], Plan: plan, Workers: a.workers, Version: version(), Key: hex.EncodeToString(secret), Hosts: append(hosts, listen), Now: time.Now}
		l, err := net.Listen("tcp", net.JoinHostPort(listen, strconv.Itoa(port)))
		if errors.Is(err, syscall.EADDRINUSE) {
			return work.Inputf("port %d is in use; give another with --port, or 0 for any", port)
		}
		if err != nil {
			return fmt.Errorf("listen on %s: %w", listen, err)
		}
		defer l.Close()
		s, err := page.New(cmd.Context(), cfg)
		if err != nil {
			return err
		}
		a.endProgress()
		address := "http://" + l.Addr().String() + "/"
		if a.asJSON {
			if err := a.json(map[string]string{"address": address, "key": cfg.Key, "page": address + "#key=" + cfg.Key}); err != nil {
				return err
			}
		} else {
			p := a.printer()
			p.line("The planning page of %s: open", p.bold(args[0]))
			p.line("  %s#key=%s", address, cfg.Key)
			if err := p.flush(); err != nil {
				return err
			}
			a.note("Keep the key to yourself: it allows changes. Ctrl-C ends the server.")
			if !net.ParseIP(listen).IsLoopback() {
				a.note("warning: %s is not this machine alone; everyone who reaches it can look, and nothing is encrypted", listen)
			}
		}
		return s.Serve(cmd.Context(), l)
	})
	c.Flags().StringVar(&plan, "plan", "", "the plan in `FOLDER` (default: plan in the survey folder)")
	c.Flags().IntVar(&port, "port", 8420, "listen on port `N`; 0 takes any that is free")
	c.Flags().StringVar(&listen, "listen", "127.0.0.1", "listen on this `ADDRESS`")
	c.Flags().StringSliceVar(&hosts, "host", nil, "answer to this `NAME` too")
	return c
}
