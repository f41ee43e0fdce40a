package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
	"github.com/spf13/viper"
)

// A setting is a flag's long name. What the command line says counts most,
// then NIGHTWRIGHT_NAME in the environment (a dash becomes _), then the
// settings file, then the flag's default.

const envPrefix = "NIGHTWRIGHT"

// perCommand are flags whose value belongs to one call and is no setting.
var perCommand = []string{"help", "version", "settings"}

// applySettings gives every flag that the command line left alone the value
// that the environment or the settings file has for it.
func (a *app) applySettings(cmd *cobra.Command) error {
	v := viper.New()
	v.SetEnvPrefix(envPrefix)
	v.SetEnvKeyReplacer(strings.NewReplacer("-", "_"))
	v.AutomaticEnv()
	file, err := a.settingsPath(v)
	if err != nil {
		return err
	}
	if file != "" {
		v.SetConfigFile(file)
		v.SetConfigType("yaml")
		if err := v.ReadInConfig(); err != nil {
			return fmt.Errorf("settings file %s: %v; want lines such as 'workers: 4'", file, err)
		}
		known := settingNames(cmd.Root())
		for _, key := range v.AllKeys() {
			if !slices.Contains(known, key) {
				return fmt.Errorf("settings file %s: there is no setting %q; there are %s", file, key, strings.Join(known, ", "))
			}
		}
	}
	var bad error
	cmd.Flags().VisitAll(func(f *pflag.Flag) {
		if f.Changed || slices.Contains(perCommand, f.Name) || !v.IsSet(f.Name) || bad != nil {
			return
		}
		if err := cmd.Flags().Set(f.Name, v.GetString(f.Name)); err != nil {
			where := "settings file " + file
			if name := envName(f.Name); os.Getenv(name) != "" {
				where = "environment variable " + name
			}
			bad = fmt.Errorf("%s: %v", where, err)
		}
	})
	return bad
}

// settingsPath finds the settings file; "" when there is none. One that was
// named must exist.
func (a *app) settingsPath(v *viper.Viper) (string, error) {
	named := a.settingsFile
	if named == "" {
		named = v.GetString("settings")
	}
	if named != "" {
		if _, err := os.Stat(named); err != nil {
			return "", fmt.Errorf("settings file %s: %v; want a YAML file that can be read", named, errors.Unwrap(err))
		}
		return named, nil
	}
	places := []string{"nightwright.yaml"}
	if dir, err := os.UserConfigDir(); err == nil {
		places = append(places, filepath.Join(dir, "nightwright", "settings.yaml"))
	}
	for _, p := range places {
		if _, err := os.Stat(p); err == nil {
			return p, nil
		} else if !errors.Is(err, fs.ErrNotExist) {
			return "", fmt.Errorf("settings file: %v; make it readable or take it away", err)
		}
	}
	return "", nil
}

func envName(flag string) string {
	return envPrefix + "_" + strings.ToUpper(strings.ReplaceAll(flag, "-", "_"))
}

// settingNames lists the flags of all commands, sorted.
func settingNames(root *cobra.Command) []string {
	var names []string
	add := func(f *pflag.Flag) {
		if !slices.Contains(perCommand, f.Name) && !slices.Contains(names, f.Name) {
			names = append(names, f.Name)
		}
	}
	root.PersistentFlags().VisitAll(add)
	for _, c := range root.Commands() {
		c.Flags().VisitAll(add)
	}
	slices.Sort(names)
	return names
}
