"""Opening, saving, reporting and the clipboard."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtGui import QGuiApplication, QPixmap
from PySide6.QtPrintSupport import QPrintDialog, QPrinter
from PySide6.QtWidgets import QFileDialog, QMessageBox

from spinledger.errors import OutputError
from spinledger.project.document import with_sample
from spinledger_app.clipboard import put_table
from spinledger_app.handlers.context import Context
from spinledger_app.places import Kind, example_place, kind_of
from spinledger_app.presenters.clipboard import table_html, table_tsv
from spinledger_app.presenters.line_list import line_tsv
from spinledger_app.presenters.wording import say
from spinledger_app.sketch.transfer import text_of
from spinledger_app.views import dialogs


class FileHandlers:
    """What the Project and Edit menus do."""

    def __init__(self, context: Context) -> None:
        self.context = context
        self.window, self.bench = context.window, context.bench
        self.settings, self.look = context.settings, context.look

    def actions(self) -> dict[str, Callable[[], None]]:
        """Handlers by the names of the action table."""
        return {
            "new": self.new,
            "open": self.open,
            "open_folder": self.open_folder,
            "example": self.example,
            "save": self.save,
            "save_as": self.save_as,
            "sample": self.sample,
            "report": self.report,
            "pdf": self.pdf,
            "print": self.print_report,
            "copy_lines": self.copy_lines,
            "quit": self.quit,
            "undo": self.undo,
            "redo": self.redo,
            "paste": self.paste,
            "open_structure": self.open_structure,
            "type_structure": self.type_structure,
            "copy_picture": self.copy_picture,
            "copy_sentence": self.copy_sentence,
            "copy_table": self.copy_table,
            "copy_smiles": self.copy_smiles,
        }

    def open_places(self, places: list[str]) -> None:
        """Open dropped or given files and folders, each by what it is."""
        for place in places:
            path = Path(place)
            match kind_of(path):
                case Kind.PROJECT:
                    self.bench.open_project(path)
                    self.settings.add_recent(str(path))
                case Kind.STRUCTURE:
                    self.bench.take_structure(str(path))
                case Kind.DATA:
                    self.bench.open_data(path)
                    self.settings.add_recent(str(path))

    def _chosen_place(self, chosen: str) -> str:
        if chosen:
            self.settings.last_folder = str(Path(chosen).parent)
        return chosen

    def new(self) -> None:
        """Start with nothing, after asking for what is unsaved."""
        if self.may_lose():
            self.bench.new_project()

    def open(self) -> None:
        """Choose a data or project file."""
        chosen, _ = QFileDialog.getOpenFileName(
            self.window, say("Open data or project"), self.settings.last_folder
        )
        if self._chosen_place(chosen):
            self.open_places([chosen])

    def open_folder(self) -> None:
        """Choose a data folder."""
        chosen = QFileDialog.getExistingDirectory(
            self.window, say("Open data folder"), self.settings.last_folder
        )
        if self._chosen_place(chosen):
            self.open_places([chosen])

    def example(self) -> None:
        """Open the sample spectrum with its structure."""
        place = example_place()
        if place is not None:
            self.bench.open_data(place.data)
            self.bench.take_structure(str(place.structure))

    def fill_recent(self) -> None:
        """List the places that were opened last."""
        menu = self.window.recent_menu
        menu.clear()
        for place in self.settings.recent:
            action = menu.addAction(place)
            action.triggered.connect(
                lambda _=False, place=place: self.open_places([place])
            )
        if not self.settings.recent:
            menu.addAction(say("Nothing was opened yet")).setEnabled(False)

    def show_file_list(self) -> None:
        """Show the files of a place that could not be read."""
        place = self.bench.last_fault_place
        if place is not None:
            dialogs.FileListDialog(self.look, place, self.window).exec()

    def save(self) -> None:
        """Save where the project was saved before, or ask."""
        path = self.bench.session.path
        if path is None:
            self.save_as()
        else:
            self.bench.save(path)

    def save_as(self) -> None:
        """Ask where to save, then save."""
        name = self.bench.project.source_name or self.bench.project.name
        start = str(Path(self.settings.last_folder) / f"{Path(name).stem}.sledger")
        chosen, _ = QFileDialog.getSaveFileName(
            self.window, say("Save project"), start, "Spin Ledger (*.sledger)"
        )
        if self._chosen_place(chosen):
            path = Path(chosen)
            self.bench.save(path if path.suffix else path.with_suffix(".sledger"))

    def sample(self) -> None:
        """Edit what the label of the tube says."""
        dialog = dialogs.SampleDialog(self.look, self.bench.project.sample, self.window)
        if dialog.exec():
            sample = dialog.sample()
            self.bench.session.apply(
                say("sample and batch"), lambda project: with_sample(project, sample)
            )

    def report(self) -> None:
        """Ask for a folder and formats, then write the report."""
        dialog = dialogs.ReportDialog(self.look, self.settings.last_folder, self.window)
        if dialog.exec() and dialog.folder():
            self.settings.last_folder = dialog.folder()
            self.bench.write_report(Path(dialog.folder()), dialog.formats())

    def pdf(self) -> None:
        """Ask for a file, then write the report as PDF."""
        start = str(Path(self.settings.last_folder) / "report.pdf")
        chosen, _ = QFileDialog.getSaveFileName(
            self.window, say("Report as PDF"), start, "PDF (*.pdf)"
        )
        if self._chosen_place(chosen):
            self.bench.write_pdf(Path(chosen))

    def print_report(self) -> None:
        """Ask for a printer, then print the report."""
        printer = QPrinter(QPrinter.PrinterMode.HighResolution)
        if QPrintDialog(printer, self.window).exec():
            self.print_on(printer)

    def print_on(self, printer: QPrinter) -> None:
        """Print the report's pages."""
        from spinledger_app.pdf.report import (  # noqa: PLC0415 - loads much
            print_report,
        )

        ledger = self.bench.project.ledger
        if ledger is None:
            return
        try:
            print_report(ledger, printer, self.bench.report_context())
        except OSError as error:
            self.window.status.show_message(str(error), is_error=True)
            return
        self.window.status.show_message(say("Report sent to the printer."))

    def copy_lines(self) -> None:
        """Put the line list on the clipboard."""
        evidence = self.bench.project.evidence
        if evidence is not None:
            QGuiApplication.clipboard().setText(line_tsv(evidence))
            self.window.status.show_message(say("Line list copied."))

    def quit(self) -> None:
        """Close the window."""
        self.window.close()

    def undo(self) -> None:
        """Take the last step back."""
        self.bench.session.undo_stack.undo()

    def redo(self) -> None:
        """Do the step again that was taken back."""
        self.bench.session.undo_stack.redo()

    def paste(self) -> None:
        """Take a structure, or data files, from the clipboard."""
        data = QGuiApplication.clipboard().mimeData()
        places = [url.toLocalFile() for url in data.urls() if url.isLocalFile()]
        if places:
            self.open_places(places)
            return
        text = text_of(data)
        if text.strip():
            self.bench.take_structure(text)
        else:
            self.window.status.show_message(
                say(
                    "The clipboard holds no structure; copy SMILES or a molfile first."
                ),
                is_error=True,
            )

    def save_structure_picture(self) -> None:
        """Ask for a file, then write the structure as a vector picture."""
        start = str(Path(self.settings.last_folder) / "structure.svg")
        chosen, _ = QFileDialog.getSaveFileName(
            self.window, say("Save picture"), start, "SVG (*.svg)"
        )
        if self._chosen_place(chosen):
            try:
                self.window.sketch.editor.save_svg(Path(chosen))
            except OutputError as error:
                self.window.status.show_message(str(error), is_error=True)
                return
            self.window.status.show_message(say("Picture saved."))

    def open_structure(self) -> None:
        """Choose a structure file."""
        chosen, _ = QFileDialog.getOpenFileName(
            self.window,
            say("Open structure file"),
            self.settings.last_folder,
            say("Structures") + " (*.mol *.sdf *.smi *.smiles *.inchi *.txt)",
        )
        if self._chosen_place(chosen):
            self.bench.take_structure(chosen)

    def type_structure(self) -> None:
        """Ask for a SMILES."""
        text = dialogs.ask_text(
            self.look, self.window, say("Structure"), say("SMILES or InChI")
        )
        if text:
            self.bench.take_structure(text)

    def copy_picture(self) -> None:
        """Put a picture of the lanes on the clipboard, twice as fine as the screen."""
        lanes = self.window.lanes
        picture = QPixmap(lanes.size() * 2)
        picture.setDevicePixelRatio(2)
        lanes.cursor_x = None
        lanes.render(picture)
        QGuiApplication.clipboard().setPixmap(picture)
        self.window.status.show_message(say("Picture copied."))

    def copy_sentence(self) -> None:
        """Put the experimental-section text on the clipboard."""
        self.bench.ask_sentence()

    def take_sentence(self, text: str) -> None:
        """Put the sentence that was made on the clipboard."""
        QGuiApplication.clipboard().setText(text)
        self.window.status.show_message(say("Experimental sentence copied."))

    def copy_table(self) -> None:
        """Put the assignment table on the clipboard, as text and as a table."""
        ledger = self.bench.project.ledger
        if ledger is not None:
            put_table(table_tsv(ledger), table_html(ledger))
            self.window.status.show_message(say("Assignment table copied."))

    def copy_smiles(self) -> None:
        """Put the structure's SMILES on the clipboard."""
        structure = self.bench.project.structure
        if structure is not None:
            QGuiApplication.clipboard().setText(structure.smiles)
            self.window.status.show_message(say("SMILES copied."))

    def may_lose(self) -> bool:
        """Whether what is unsaved may go; asks where something is."""
        if not self.bench.session.is_unsaved:
            return True
        box = QMessageBox(self.window)
        box.setText(say("Save the project first?"))
        box.setInformativeText(
            say("What was changed since the last save is lost else.")
        )
        buttons = QMessageBox.StandardButton
        box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
        answer = box.exec()
        if answer == buttons.Save:
            self.save()
            return False  # saved in the background; the user goes on then
        return answer == buttons.Discard
