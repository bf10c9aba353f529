"""Reading and writing of parameter tables: every fault is named with its line, all of them at once."""

import pickle
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

import basis_params
from basis_params.model import FrozenMapping
from basis_params.reader import COLUMNS, HEADER_KEYS, parse_table

HEADER = ",".join(COLUMNS)
HYDROGEN = "H,1,1,s,-13.6,1.3,,,,own,table 1,memory"
OXYGEN_S = "O,6,2,s,-32.3,2.275,,,,own,table 1,memory"
OXYGEN_P = "O,6,2,p,-14.8,2.275,,,,own,table 1,memory"
TUNGSTEN_D = "W,6,5,d,-10.37,4.982,0.6685,2.068,0.5424,own,table 1,memory"


def parse(*rows, head=(), header=HEADER):
    text = "\n".join([*head, header, *rows]) + "\n"
    return parse_table(text, "own.csv", "own", base=basis_params.load_set("standard"))


def faults_of(*rows, **kwargs):
    with pytest.raises(basis_params.ParameterFileError) as caught:
        parse(*rows, **kwargs)
    message = str(caught.value)
    assert message.startswith("own.csv: ")
    assert "\n" not in message
    assert message.isprintable()
    return caught.value.faults


def test_minimal_table_inherits_the_settings_of_standard():
    table = parse(OXYGEN_S, OXYGEN_P)
    assert table.name == "own"
    assert table.settings == basis_params.load_set("standard").settings
    assert table.inherited == ("K", "weighting", "K_sigma", "K_pi", "K_delta", "K_decay_per_A", "lambda")
    assert [shell.label for shell in table.element("O").shells] == ["2s", "2p"]
    assert table.element("O").shells[0].coefficients == (1.0,)


def test_header_keys_are_read():
    head = [
        "# name = mine",
        "# edition = 2",
        "# K = 1.9",
        "# weighting = no",
        "# K_pi = 2.0",
        "# K_sd = 0.1",
        "# A note.",
    ]
    table = parse(HYDROGEN, head=head)
    assert (table.name, table.edition, table.notes) == ("mine", "2", ("A note.",))
    assert (table.settings.K, table.settings.weighting, table.settings.K_pi) == (1.9, False, 2.0)
    # lambda is taken from the standard set together with its standard deviation.
    assert dict(table.settings.sd) == {"K": 0.1, "lambda": basis_params.load_set("standard").settings.sd["lambda"]}
    assert "K" not in table.inherited


def test_shells_are_ordered_by_l_then_n_and_l_may_be_a_digit():
    rows = ["U,12,7,1,-5.5,1.914,,,,own,x,memory", "U,12,6,1,-26.03,4.033,,,,own,x,memory"]
    rows.append("U,12,7,0,-5.5,1.914,,,,own,x,memory")
    assert [shell.label for shell in parse(*rows).element("U").shells] == ["7s", "6p", "7p"]


def test_optional_columns_may_stand_in_any_order():
    row = f"{HYDROGEN},0.2,,1.5,"
    shell = parse(row, header=HEADER + ",zeta_sd,zeta3,h_ii_sd_eV,c3").element("H").shells[0]
    assert (shell.zeta_sd, shell.h_ii_sd_eV, shell.zetas) == (0.2, 1.5, (1.3,))


def test_norm_rule_accepts_the_right_and_refuses_the_misremembered_tungsten_row():
    """Law: the norm of a contracted function is 1; 0.6940, 0.5631 gives 1.08."""
    assert parse(TUNGSTEN_D).element("W").shells[0].coefficients == (0.6685, 0.5424)
    (fault,) = faults_of(TUNGSTEN_D.replace("0.6685", "0.6940").replace("0.5424", "0.5631"))
    assert "line 2" in fault
    assert "1.0776" in fault


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ("Xx,6,2,s,-32.3,2.275,,,,own,x,memory", "no element"),
        ("O,six,2,s,-32.3,2.275,,,,own,x,memory", "whole number"),
        ("O,6,2,s,nan,2.275,,,,own,x,memory", "finite"),
        ("O,6,2,s,-inf,2.275,,,,own,x,memory", "finite"),
        ("O,6,2,s,-32.3,1e308,,,,own,x,memory", "norm"),
        ("O,6,2,s,deep,2.275,,,,own,x,memory", "write a number"),
        ("O,6,2,s,-32.3,-2.275,,,,own,x,memory", "positive"),
        ("O,6,2,s,-32.3,0,,,,own,x,memory", "positive"),
        ("O,6,2,s,-32.3,,,,,own,x,memory", "positive"),
        ("O,6,2,d,-32.3,2.275,,,,own,x,memory", "above l"),
        ("O,6,2,4,-32.3,2.275,,,,own,x,memory", "s, p, d, f"),
        ("O,6,2,g,-32.3,2.275,,,,own,x,memory", "s, p, d, f"),
        ("O,6,2,s,-32.3,2.275,,1.0,,own,x,memory", "all coefficients"),
        ("O,6,2,s,-32.3,2.275,,,0.5,own,x,memory", "from the left"),
        ("O,6,2,s,-32.3,2.275,0.9,,,own,x,memory", "norm"),
        ("O,6,2,s,-32.3,2.275,,,,,x,memory", "source_key is empty"),
        ("O,6,2,s,-32.3,2.275,,,,own,x,guessed", "read, memory, derived"),
        ("O,6,2,s,-32.3,2.275,,,,own,x", "cells under a header"),
        ('O,6,2,s,-32.3,2.275,,,,own,"x,memory', "not valid CSV"),
        ("O,9,2,s,-32.3,2.275,,,,own,x,memory", "valence electrons"),
        ("O,6,2,s,-32.3,2.275,,,,own,=cmd(),memory", "formula"),
        ("O,6,2,s,-32.3,2.275,,,,own,\x1b[2J,memory", "control characters"),
    ],
)
def test_fault_of_one_row_names_line_and_mend(row, words):
    faults = faults_of(row)
    assert any(words in fault for fault in faults)
    assert all(fault.startswith("line ") for fault in faults)


def test_duplicate_shell_and_differing_valence_electrons():
    faults = faults_of(OXYGEN_S, OXYGEN_S, OXYGEN_P.replace("O,6", "O,4"))
    assert faults[0] == "line 3: O 2s is given twice: keep one row"
    assert faults[1].startswith("line 4: O has 6 valence electrons above and 4 here")


def test_all_faults_come_in_one_error():
    faults = faults_of("Xx,1,1,s,-1,1,,,,a,b,memory", OXYGEN_S.replace("2.275", "-1"), OXYGEN_P.replace("memory", "?"))
    assert [fault.split(":")[0] for fault in faults] == ["line 2", "line 3", "line 4"]


def test_unknown_header_key_lists_the_known_keys():
    (fault,) = faults_of(HYDROGEN, head=["# Kappa = 1.75"])
    assert fault == f"line 1: unknown key 'Kappa': known keys are {', '.join(HEADER_KEYS)}"


@pytest.mark.parametrize(
    ("line", "words"),
    [
        ("# K = much", "write a number"),
        ("# K = -1", "0 or more"),
        ("# weighting = maybe", "yes or no"),
        ("# lambda_sd = nan", "finite"),
        ("# edition =", "empty"),
    ],
)
def test_fault_of_a_header_value(line, words):
    (fault,) = faults_of(HYDROGEN, head=["# name = own", line])
    assert fault.startswith("line 2: ")
    assert words in fault


def test_header_key_given_twice():
    assert faults_of(HYDROGEN, head=["# K = 1", "# K = 2"]) == ("line 2: K is set twice: keep one (first on line 1)",)


@pytest.mark.parametrize("header", [HEADER.replace("zeta1", "zeta"), HEADER + ",colour", HEADER + ",zeta_sd,zeta_sd"])
def test_wrong_header(header):
    assert any("the header is" in fault for fault in faults_of(HYDROGEN, header=header))


def test_table_without_rows():
    assert any("no rows" in fault for fault in faults_of())


def test_a_table_without_base_must_state_every_key():
    with pytest.raises(basis_params.ParameterFileError, match=r"K, weighting, .* lambda"):
        parse_table(f"{HEADER}\n{HYDROGEN}\n", "own.csv", "own")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "empty"),
        (b" \n\n", "empty"),
        (b"# name = x\n", "the header is"),
        (b"\x89PNG\r\n\x1a\n\x00\xff", "not UTF-8"),
        (b"element,\x00", "binary"),
    ],
)
def test_files_that_are_no_tables(tmp_path, content, words):
    path = tmp_path / "own.csv"
    path.write_bytes(content)
    with pytest.raises(basis_params.ParameterFileError, match=words):
        basis_params.read_table(path)


def test_missing_file_and_folder(tmp_path):
    with pytest.raises(FileNotFoundError, match="no such file"):
        basis_params.read_table(tmp_path / "none.csv")
    with pytest.raises(basis_params.ParameterFileError, match="not a file"):
        basis_params.read_table(tmp_path)
    with pytest.raises(FileNotFoundError, match=r"neither a parameter set \(.*standard.*\) nor a file"):
        basis_params.load("standrad")


def test_file_name_is_no_name_if_hostile(tmp_path):
    path = tmp_path / "=cmd\x07.csv"
    path.write_text(f"{HEADER}\n{HYDROGEN}\n")
    with pytest.raises(basis_params.ParameterFileError, match="control characters") as caught:
        basis_params.read_table(path)
    assert str(caught.value).isprintable()


def test_byte_order_mark_and_windows_line_ends_are_accepted(tmp_path):
    path = tmp_path / "own.csv"
    path.write_bytes(b"\xef\xbb\xbf" + f"# K = 1.9\r\n{HEADER}\r\n{HYDROGEN}\r\n".encode())
    table = basis_params.load(path)
    assert (table.settings.K, table.origin) == (1.9, str(path))


def test_missing_element_error_names_set_and_mend():
    table = parse(HYDROGEN)
    with pytest.raises(basis_params.MissingElementError, match="no parameters for 'Fe' in the set 'own'") as caught:
        table.element("Fe")
    assert isinstance(caught.value, KeyError)
    assert str(pickle.loads(pickle.dumps(caught.value))) == str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("name", basis_params.available_sets())
def test_shipped_set_survives_writing_and_reading(name):
    table = basis_params.load_set(name)
    again = parse_table(basis_params.format_table(table), "own.csv", "other")
    assert again == table
    assert hash(again) == hash(table)
    assert again.notes == table.notes
    assert again.inherited == ()


def test_equality_follows_content_not_formatting_or_origin():
    table = parse(OXYGEN_S, OXYGEN_P)
    assert table == parse(OXYGEN_P.replace("-14.8", "-14.80"), OXYGEN_S, head=["# a remark"])
    assert table != parse(OXYGEN_S, OXYGEN_P.replace("-14.8", "-14.9"))
    assert table != replace(table, settings=replace(table.settings, K=1.8))


def test_tables_are_read_only_hashable_and_picklable():
    table = basis_params.load_set("standard")
    assert pickle.loads(pickle.dumps(table)) == table
    with pytest.raises(TypeError):
        table.elements["O"] = table.elements["N"]
    assert hash(FrozenMapping({"a": 1, "b": 2})) == hash(FrozenMapping({"b": 2, "a": 1}))
    assert basis_params.load_set("standard") is table


@given(st.text(max_size=300))
def test_any_text_gives_a_table_or_one_printable_line(text):
    for hostile in (text, f"# {text}\n{HEADER}\n{HYDROGEN}\n", f"{HEADER}\n{HYDROGEN.replace('own', text)}\n"):
        try:
            table = parse_table(hostile, "own.csv", "own", base=basis_params.load_set("standard"))
        except basis_params.ParameterFileError as error:
            assert str(error).isprintable()
        else:
            assert all(note.isprintable() for note in table.notes)
            assert parse_table(basis_params.format_table(table), "own.csv", "own") == table
