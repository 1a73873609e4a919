"""Options and fixtures that more than one folder of tests uses."""


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
