# check: what it finds, and what it leaves alone.
for kind in clean cross moved round bodies poses muted attached names resolve nan; do
    make "$kind" "$kind.h5"
done
try check-clean 0 check clean.h5
try check-cross 1 check cross.h5
try check-cross-json 1 check --json cross.h5
try check-cross-most 1 check --most 1 cross.h5
try check-cross-one-thread 1 check --threads 1 cross.h5
try check-moved 1 check moved.h5
try check-round 0 check round.h5
try check-bodies 0 check bodies.h5
try check-bodies-counted 1 check --bodies bodies.h5
try check-poses 1 check poses.h5
try check-muted 0 check muted.h5
try check-attached 0 check attached.h5
try check-names 1 check names.h5
try check-proposed 1 check resolve.h5
try check-nan 2 check nan.h5
cp cross.h5 cross.h5.part
try check-part 1 check cross.h5.part
