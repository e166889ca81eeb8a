# reduce: what is left, that it still shows, and what cannot be reduced.
for kind in resolve tangled cross poses moved; do
    make "$kind" "$kind.h5"
done
filter='s/[0-9]* tests/N tests/; s/correction [0-9.e-]*$/correction X/'
try reduce-correction 0 reduce resolve.h5 --keep 'correction>0.005' -o small.h5
holds reduce-files -f small.h5 -a -f small.obj -a -f small.c -a -f small.png
filter=''
try reduce-replayed 0 replay small.h5
filter='s/created by.*/created by X/; s/: [0-9]* bytes, complete/: N bytes, complete/; /^settings/d; s/[0-9]* bytes of memory/N bytes of memory/'
try reduce-info 0 info small.h5
filter='s/[0-9]* tests/N tests/'
try reduce-tangled 0 reduce tangled.h5 --frame 1 --keep verdict:tangled -o small.h5 --force
try reduce-intersect 0 reduce tangled.h5 --frame 1 --keep intersect -o small.h5 --force
try reduce-crossing 0 reduce resolve.h5 --keep crossing --as-given -o small.h5 --force
try reduce-poses 0 reduce poses.h5 --frame 1 --keep crossing -o small.h5 --force
try reduce-differs 0 reduce resolve.h5 --keep differs --aim-margin 4e-6 -o small.h5 --force --jobs 1
filter='s/"tests": .*/"tests": N,/; s/"seconds": .*/"seconds": S,/'
try reduce-json 0 reduce --json tangled.h5 --frame 1 --keep verdict:tangled -o small.h5 --force
filter=''
# The same result with any number of jobs, and from a run that goes on where another ended.
"$raddle" reduce resolve.h5 --keep 'correction>0.005' -o one.h5 --jobs 1 >out
"$raddle" reduce resolve.h5 --keep 'correction>0.005' -o three.h5 --jobs 3 >out
checks=$((checks + 1))
cmp -s one.h5 three.h5 || fail reduce-jobs 'one.h5 and three.h5 differ'
filter='s/[0-9]* tests/N tests/; s/correction [0-9.e-]*$/correction X/'
try reduce-resume 0 reduce resolve.h5 --keep 'correction>0.005' -o three.h5 --resume
checks=$((checks + 1))
cmp -s one.h5 three.h5 || fail reduce-resume 'one.h5 and three.h5 differ'
# Any command is a predicate: it is given a shot, whatever it is called.
cat >finds.sh <<'END'
"$1" check "$2" >/dev/null
END
filter="s/[0-9]* tests/N tests/; s|$raddle|RADDLE|"
try reduce-command 0 reduce resolve.h5 --keep "command:sh finds.sh '$raddle' \"\$1\"" -o 'odd "name".h5'
rm -f odd* one.* three.* finds.sh
filter=''
try reduce-exists 2 reduce resolve.h5 --keep 'correction>0.005' -o small.h5
try reduce-absent 2 reduce resolve.h5 --keep verdict:pinched -o other.h5
try reduce-keep 2 reduce resolve.h5 --keep beauty -o other.h5
try reduce-bound 2 reduce resolve.h5 --keep 'passes>x' -o other.h5
try reduce-no-keep 2 reduce resolve.h5 -o other.h5
try reduce-no-output 2 reduce resolve.h5 --keep crossing
try reduce-frame 2 reduce resolve.h5 --frame 3 --keep crossing -o other.h5
try reduce-pose-0 2 reduce poses.h5 --keep crossing -o other.h5
try reduce-poses-verdict 2 reduce poses.h5 --frame 1 --keep verdict:tangled -o other.h5
try reduce-folder 2 reduce resolve.h5 --keep 'correction>0.005' -o no/such/other.h5
only cross.h5 moved.h5 poses.h5 resolve.h5 tangled.h5 small.h5 small.obj small.c small.png
