# Reads the output of test runners and prints "PASSED FAILED", summed over their closing lines, or "none" where no
# runner came to its end. A test that could not be run (an error) counts as failed. Tested in tests/house.rs.

{ gsub(/\033\[[0-9;]*m/, "") } # colours

# cargo test: "test result: ok. 12 passed; 0 failed; ..."
/^test result: (ok|FAILED)\. [0-9]+ passed; [0-9]+ failed;/ { add(); next }
# pytest: "1 failed, 5 passed, 1 skipped in 2.31s", with or without a frame of =
/^(=+ )?([0-9]+ [a-z]+, )*[0-9]+ [a-z]+ in [0-9.]+s( \([0-9:]+\))?( =+)?$/ { add(); next }
# kernelcheck: "77 passed, 1 failed, 4 skipped"
/^[0-9]+ passed, [0-9]+ failed, [0-9]+ skipped$/ { add(); next }

function add(    i, count) {
  for (i = 1; i < NF; i++) {
    count = $i
    if (count !~ /^[0-9]+$/) continue
    if ($(i + 1) ~ /^passed[,;]?$/) passed += count
    else if ($(i + 1) ~ /^(failed|errors?)[,;]?$/) failed += count
  }
  closed++
}

END { if (closed) print passed + 0, failed + 0; else print "none" }
