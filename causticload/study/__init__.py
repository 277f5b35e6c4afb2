"""The study file: read, check, write."""

from causticload.study.read import read_study
from causticload.study.schema import describe_keys
from causticload.study.write import input_hashes, study_digest, write_study

__all__ = ["describe_keys", "input_hashes", "read_study", "study_digest", "write_study"]
