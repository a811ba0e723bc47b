# Audits an archive of sealed notebooks in shards, and reports on all of them together. See README.md beside this file.

archive = str(config["archive"]).split()
shards = int(config.get("shards", 4))
folder = config.get("output", "audit")
options = str(config.get("options", ""))
jobs = int(config.get("jobs", 1))
program = config.get("program", "hessbook")
numbers = range(1, shards + 1)


rule all:
    input:
        expand(f"{folder}/audit.{{form}}", form=["html", "xml", "json", "txt", "status"]),


# Status 1 and 2 are findings, which belong into the report. That the audit was made, and not refused beside the state of an
# earlier one, is what a further line "finished" in the state says.
rule shard:
    output:
        done=touch(f"{folder}/shards/{{n}}.done"),
    params:
        state=lambda wildcards: f"{folder}/shards/{wildcards.n}.json",
        # Named here, so that a shard is audited again where they change.
        program=program,
        options=options,
    threads: jobs
    shell:
        "mkdir -p {folder:q}/shards; "
        "finished() {{ if test -e {params.state:q}; then grep -c '^{{\"finished\"' {params.state:q} || true; else echo 0; fi; }}; "
        "before=$(finished); "
        "{params.program:q} audit {archive:q} --shard {wildcards.n}/{shards} --resume {params.state:q} --jobs {threads} "
        "{params.options} > /dev/null || true; "
        "test $(finished) -gt $before"


rule together:
    input:
        expand(f"{folder}/shards/{{n}}.done", n=numbers),
    output:
        page=f"{folder}/audit.html",
        junit=f"{folder}/audit.xml",
        json=f"{folder}/audit.json",
        text=f"{folder}/audit.txt",
        status=f"{folder}/audit.status",
    params:
        states=[f"{folder}/shards/{n}.json" for n in numbers],
    shell:
        "{program} audit --gathered {params.states:q} --format json > {output.json:q} || true; "
        "status=0; {program} audit --gathered {params.states:q} --page {output.page:q} --junit {output.junit:q} "
        "> {output.text:q} || status=$?; echo $status > {output.status:q}; test -s {output.page:q}"
