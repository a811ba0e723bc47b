# Read by tests/run, .ci/run and .ci/long with `source`: runs steps in turn, the next one also after one has failed, and
# prints what each took.

step_rows=()
steps_failed=0

# step NAME COMMAND...
step() {
  local name=$1 from=$SECONDS verdict=passed status=0
  shift
  printf '\n== %s\n' "$name"
  "$@" || status=$?
  if ((status)); then
    verdict="FAILED (status $status)"
    steps_failed=$((steps_failed + 1))
  fi
  step_rows+=("$(printf '%6d s  %-32s %s' $((SECONDS - from)) "$name" "$verdict")")
}

# step_with PATH NAME COMMAND...: a step whose means may be absent from the tree, which is then said and is no failure.
step_with() {
  local path=$1
  shift
  if [[ -e $path ]]; then
    step "$@"
  else
    step_rows+=("$(printf '%6s    %-32s %s' - "$1" "not run: there is no $path")")
  fi
}

steps_table() {
  printf '\n'
  printf '%s\n' "${step_rows[@]}"
}
