# Below a checkpoint, inputs are asked for through the checkpoint. Only then does Snakemake look at what it wrote, see
# that a file's content is what it was, and leave the jobs below alone.


def after(asked, names):
    """An input function: one path or several in the study's folder, known once the checkpoints `asked` are done."""

    def given(wildcards):
        for checkpoint in asked:
            getattr(checkpoints, checkpoint).get()
        if isinstance(names, str):
            return wiring.path(names.format(**wildcards))
        return [wiring.path(name) for name in names]

    return given


def after_validation(names):
    return after(["validate_returns"], names)


def after_cutting(names):
    return after(["validate_returns", "cut_subperiods"], names)


def raw(source):
    """Raw files. Their digests say when they have changed, not their times; only the demo market's are made here."""
    if source is None:
        return []
    files = list(source.files)
    return files if study.is_made(source) else [ancient(file) for file in files]


def sort_inputs(wildcards):
    """What a set of test assets is made from: tables of ours, or a raw file."""
    supplied = study.sorts[wildcards.sort].source
    return raw(supplied) if supplied else wiring.sort_inputs(wildcards.sort)


def beta_inputs(wildcards):
    """The panel and the market that betas are estimated from, by name."""
    checkpoints.validate_returns.get()
    return wiring.beta_inputs(wildcards.estimate)


def sort_digests(wildcards):
    """The digests of the raw file that a set of test assets is made from, where it is."""
    supplied = study.sorts[wildcards.sort].source
    return wiring.raw_digests(f"portfolios.{wildcards.sort}") if supplied else []


def priced(wildcards):
    """The estimates of each subperiod, known once the subperiods are cut."""
    checkpoints.validate_returns.get()
    index = checkpoints.cut_subperiods.get().output.index
    return [wiring.path(f"pricing/{name}.parquet") for name in subperiod_names(index)]
