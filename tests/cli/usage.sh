# Command lines: verbs, options, messages.
try usage-nothing 2
try usage-help 0 --help
filter='s/^build: .*/build: B/; s/^code path: .*/code path: P/'
try usage-version 0 --version
filter=''
try usage-unknown 2 bogus
for verb in info check resolve replay reduce import export; do
    try "usage-help-$verb" 0 "$verb" --help
    try "usage-none-$verb" 2 "$verb"
    try "usage-option-$verb" 2 "$verb" --no-such-option
done
for verb in info check replay; do
    try "usage-absent-$verb" 2 "$verb" absent.h5
done
for verb in resolve import export; do
    try "usage-absent-$verb" 2 "$verb" absent.h5 -o out.h5
done
try usage-two-operands 2 info a.h5 b.h5
try usage-value-missing 2 check a.h5 --most
try usage-value-on-switch 2 info --json=yes a.h5
try usage-not-a-number 2 check --threads two a.h5
try usage-fraction 2 check --threads 1.5 a.h5
try usage-out-of-range 2 check --threads 0 a.h5
try usage-control-characters 2 info "$(printf 'a\nb\033[31m.h5')"
try usage-dashes 2 info -- --json
try usage-empty-name 2 info ''
only
