"""Options and fixtures that more than one folder of tests uses."""

import secrets


def pytest_addoption(parser):
    parser.addoption(
        "--rewrite-golden",
        action="store_true",
        help="write the text outputs in tests/cli/golden anew; look at each before a commit",
    )
    parser.addoption(
        "--all-stacks",
        action="store_true",
        help="compare all 2,000 random stacks with the independent discretisation, not 150",
    )
    parser.addoption(
        "--stack-seed",
        type=int,
        default=secrets.randbelow(10**9),
        help="seed of the random stacks that differ from run to run",
    )


def pytest_report_header(config):
    return f"random stacks: --stack-seed {config.getoption('--stack-seed')}"
