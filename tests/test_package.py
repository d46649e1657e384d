import inspect
import subprocess
import sys

import femag as fm


def test_every_public_name_is_what_it_says() -> None:
    """Loading a module must not put it in the place of a function of the same name."""
    for name in fm.__all__:
        first = getattr(fm, name)
        assert getattr(fm, name) is first
        assert name == "plot" or not inspect.ismodule(first), name
    assert callable(fm.solve)
    assert set(fm.__all__) <= set(dir(fm))


def test_an_unknown_name_is_an_attribute_error() -> None:
    assert not hasattr(fm, "no_such_name")


def test_importing_the_package_loads_no_library() -> None:
    code = "import sys, femag; print([m for m in ('numpy', 'gmsh', 'skfem') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
