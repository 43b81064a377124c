"""Checks of the form of a file: what was found while it was opened and cut."""

from collections.abc import Callable

from server.intake.checks.check import Check
from server.intake.forms.found import faults
from server.intake.layout import Layout
from server.intake.problems import Fault


def _told(key: str) -> Callable[[Layout], list[Fault]]:
    """What was found while the file was opened."""
    return lambda file: faults(file.found, key)


CHECKS: tuple[Check[Layout], ...] = (
    Check(
        key="not_text",
        severity="error",
        meaning="The file is not a table of text.",
        found="{what}",
        expected="a workbook (XLSX) or a CSV file: lines of text, with commas, semicolons, tabs or "
        "pipes between the fields",
        remedy="Save the table as XLSX, or as CSV with the encoding UTF-8, and upload that file.",
        find=_told("not_text"),
    ),
    Check(
        key="broken_package",
        severity="error",
        meaning="A file packed with gzip is damaged or cut short.",
        found="{packed} bytes that cannot be unpacked to their end",
        expected="a whole file packed with gzip, or the file itself",
        remedy="Pack the file again, or upload it unpacked.",
        find=_told("broken_package"),
    ),
    Check(
        key="package_too_large",
        severity="error",
        meaning="A packed file would grow beyond what one upload may hold.",
        found="{packed} bytes that unpack to more than {most}",
        expected="at most {most} bytes unpacked",
        remedy="Split the file by years and upload the parts one after the other.",
        find=_told("package_too_large"),
    ),
    Check(
        key="package_in_package",
        severity="error",
        meaning="A packed file holds another packed file.",
        found="a packed file inside a packed file",
        expected="a table of text inside, packed once",
        remedy="Unpack the file, and upload what is inside.",
        find=_told("package_in_package"),
    ),
    Check(
        key="packed_too_tightly",
        severity="error",
        meaning="A part of a zipped file is packed tighter than any table, as it is in files made "
        "to fill a computer's memory.",
        found="{packed} bytes that unpack to {size}",
        expected="a workbook as spreadsheets write it",
        remedy="Save the table again, or as CSV.",
        find=_told("packed_too_tightly"),
    ),
    Check(
        key="broken_workbook",
        severity="error",
        meaning="A workbook is damaged, locked, or not made as workbooks are.",
        found="a part that cannot be read: {part}",
        expected="a whole workbook (XLSX) without a password",
        remedy="Open it in a spreadsheet and save it again, or save the sheet as CSV.",
        find=_told("broken_workbook"),
    ),
    Check(
        key="sheet_too_large",
        severity="error",
        meaning="A sheet holds more text than one upload may.",
        found="a sheet of more than {most} bytes",
        expected="at most {most} bytes of text, with few merged cells",
        remedy="Split the sheet by years and upload the parts one after the other.",
        find=_told("sheet_too_large"),
    ),
    Check(
        key="unknown_sheet",
        severity="error",
        meaning="The mapping names a sheet that the workbook does not have.",
        found="“{sheet}” as the sheet",
        expected="one of the sheets: {sheets}",
        remedy="Correct the mapping.",
        find=_told("unknown_sheet"),
    ),
    Check(
        key="sheet_not_chosen",
        severity="error",
        meaning="A workbook has several sheets, and it is not said which is meant.",
        found="the sheets {sheets}",
        expected="the name of one of them",
        remedy="Say in the mapping which sheet it is.",
        find=_told("sheet_not_chosen"),
    ),
    Check(
        key="formula_without_value",
        severity="error",
        meaning="A cell holds a formula whose result was not kept in the file, so that its number "
        "is not known.",
        found="a formula without a kept value in cell {cell}",
        expected="a number, or a formula with its result",
        remedy="Open the workbook in a spreadsheet, let it work out the formulas and save it; or "
        "put numbers in place of the formulas.",
        find=_told("formula_without_value"),
    ),
    Check(
        key="formulas_kept",
        severity="warning",
        meaning="Cells hold formulas. Nothing is worked out here: the results that were kept in "
        "the file are used.",
        found="cells with formulas: {count}",
        expected="numbers, or formulas whose kept results are up to date",
        remedy="Look whether the workbook was saved after its last change.",
        find=_told("formulas_kept"),
    ),
    Check(
        key="hidden_cells",
        severity="warning",
        meaning="Rows or columns of the sheet are hidden. They are read like the others.",
        found="{what}",
        expected="rows and columns that are all shown",
        remedy="Look whether they belong to the table; take them out if not.",
        find=_told("hidden_cells"),
    ),
    Check(
        key="merged_filled",
        severity="warning",
        meaning="Cells are merged over several rows. Their text is taken to hold for each of these "
        "rows.",
        found="merged cells: {count}, the first at {cell}",
        expected="one text in each row",
        remedy="Look whether each row has got the right text.",
        find=_told("merged_filled"),
    ),
    Check(
        key="too_many_merged",
        severity="error",
        meaning="More cells are merged than any table needs.",
        found="ranges of merged cells: {count}",
        expected="at most {most} cells in them",
        remedy="Undo the merging of cells and save the workbook again.",
        find=_told("too_many_merged"),
    ),
    Check(
        key="beside_the_sheet",
        severity="warning",
        meaning="The workbook holds things beside the sheet that is read. They are not looked at.",
        found="{what}",
        expected="nothing else, or nothing that is needed",
        remedy="Nothing, if the sheet holds all counts.",
        find=_told("beside_the_sheet"),
    ),
    Check(
        key="unknown_encoding",
        severity="error",
        meaning="The mapping names an encoding that is not known here.",
        found="“{encoding}” as the encoding",
        expected="one of {known}",
        remedy="Correct the mapping.",
        find=_told("unknown_encoding"),
    ),
    Check(
        key="wrong_encoding",
        severity="error",
        meaning="Letters of the file are stored in another encoding than the one it is read with, "
        "or in two different ones.",
        found="the byte {byte}, which has no meaning there",
        expected="text in the encoding {encoding}",
        remedy="Say in the mapping which encoding it is, or save the file again with the encoding "
        "UTF-8.",
        find=_told("wrong_encoding"),
    ),
    Check(
        key="encoding_guessed",
        severity="warning",
        meaning="The file does not say how its letters are stored and is no UTF-8, so that its "
        "encoding was guessed.",
        found="letters read as {encoding}: “{text}”",
        expected="an encoding that is stated or shows in the bytes",
        remedy="Look whether the letters are right; if not, say in the mapping which encoding it "
        "is.",
        find=_told("encoding_guessed"),
    ),
    Check(
        key="unknown_delimiter",
        severity="error",
        meaning="The mapping names a sign between fields that cannot be one.",
        found="“{text}” as the sign between fields",
        expected="a comma, a semicolon, a tab, a pipe or a blank",
        remedy="Correct the mapping.",
        find=_told("unknown_delimiter"),
    ),
    Check(
        key="bad_heading_setting",
        severity="error",
        meaning="The mapping names a row for the heading where none can stand.",
        found="the heading in row {row}, of {rows} rows",
        expected="a row from 1 to {most}, and 1 to 10 rows",
        remedy="Correct the mapping.",
        find=_told("bad_heading_setting"),
    ),
    Check(
        key="unknown_marks",
        severity="error",
        meaning="The mapping names marks of numbers that cannot be, or one mark for two things.",
        found="“{decimal}” before decimals and “{thousands}” between thousands",
        expected="a full stop or a comma before decimals, and another mark or none between "
        "thousands",
        remedy="Correct the mapping.",
        find=_told("unknown_marks"),
    ),
    Check(
        key="notes_left_out",
        severity="warning",
        meaning="Rows below the table hold text and no counts. They are taken for notes and left "
        "out.",
        found="“{text}”",
        expected="rows of counts down to the end, or notes",
        remedy="Look whether they are notes. If not, fill in what these rows lack.",
        find=_told("notes_left_out"),
    ),
)
