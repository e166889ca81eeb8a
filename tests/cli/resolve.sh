# resolve: verdicts, exit codes, and what is left on the disk.
for kind in clean resolve resolve32 tangled nan poses thin; do
    make "$kind" "$kind.h5"
done
filter='s/, [0-9.e-]* m$/, M m/; s/[0-9]*\.[0-9]\{3\}/S/g; s/([0-9]* threads)/(T threads)/; /pairs, .* touches/d'
try resolve-clean 0 resolve clean.h5 -o clean-out.h5
try resolve-one 0 resolve resolve.h5 -o out.h5
try resolve-exists 2 resolve resolve.h5 -o out.h5
try resolve-force 0 resolve --force resolve.h5 -o out.h5
try resolve-over-itself 0 resolve --force out.h5 -o out.h5
filter=''
try resolve-checked 0 check out.h5
filter='s/: [0-9]* bytes, complete/: N bytes, complete/; s/[0-9]* bytes of memory/N bytes of memory/; /^settings/d'
try resolve-info 0 info out.h5
filter='s/, [0-9.e-]* m$/, M m/; s/[0-9]*\.[0-9]\{3\}/S/g; s/([0-9]* threads)/(T threads)/; /pairs, .* touches/d'
try resolve-float 0 resolve resolve32.h5 -o out32.h5
filter=''
try resolve-float-checked 0 check out32.h5
filter='s/:.*/:/; s/^ *[0-9][0-9]*,*$//; /^$/d'
try resolve-keys 0 resolve --json --force resolve.h5 -o out.h5
filter='s/, [0-9.e-]* m$/, M m/; s/[0-9]*\.[0-9]\{3\}/S/g; s/([0-9]* threads)/(T threads)/; /pairs, .* touches/d'
try resolve-tangled 1 resolve tangled.h5 -o tangled-out.h5 --most 2
filter=''
rm -f out.h5 out32.h5 clean-out.h5 tangled-out.h5
try resolve-nan 2 resolve nan.h5 -o out.h5
try resolve-poses 2 resolve poses.h5 -o out.h5
try resolve-zero-gap 2 resolve thin.h5 -o out.h5
try resolve-no-output 2 resolve resolve.h5
try resolve-no-folder 2 resolve resolve.h5 -o no/such/out.h5
try resolve-bad-setting 2 resolve resolve.h5 -o out.h5 --restitution 2
try resolve-bad-step 2 resolve resolve.h5 -o out.h5 --step 0
# A disk that is full: the limit on file sizes holds for root too.
checks=$((checks + 1))
(
    trap '' XFSZ
    ulimit -f 24
    "$raddle" resolve resolve.h5 -o out.h5 >out 2>err
)
code=$?
if [ "$code" -ne 3 ] || ! compare resolve-full-disk err; then
    fail resolve-full-disk "exit code $code"
fi
only clean.h5 resolve.h5 resolve32.h5 tangled.h5 nan.h5 poses.h5 thin.h5
# The same bits at any number of threads.
"$raddle" resolve resolve.h5 -o one.h5 --threads 1 >out
"$raddle" resolve resolve.h5 -o four.h5 --threads 4 >out
checks=$((checks + 1))
cmp -s one.h5 four.h5 || fail resolve-threads "one.h5 and four.h5 differ"
