"""The two jobs that the office runs: for a workbook that was loaded, and for one that was saved."""

import uno
import unohelper
from beamfuncs_component import entering, journal, linking, saving, table
from com.sun.star.lang import XServiceInfo
from com.sun.star.task import XJob

JOB = "com.sun.star.task.Job"
WORKBOOK = "com.sun.star.sheet.SpreadsheetDocument"
TABLE = table.read()
NAMES, LONG_NAMES = TABLE.names, TABLE.long_names


def enter_anew(document):
    """Let the plain names in a workbook of another program, and its calls of the Excel add-in, be the functions."""
    path = _excel_file(document)
    entering.enter_anew(document, NAMES, linking.links_to(path, TABLE.addin) if path else ())


def put_plain_names(document):
    """Write plain names into the file of a workbook that is saved the Excel way."""
    path = _excel_file(document)
    if path:
        saving.put_plain_names(path, LONG_NAMES)


class Job(unohelper.Base, XJob, XServiceInfo):
    """A job on the document of an event; whatever happens in it, the office goes on."""

    def __init__(self, context):
        pass

    def execute(self, arguments):
        document = _document(arguments)
        if document is not None and document.supportsService(WORKBOOK):
            try:
                self.work(document)
            except Exception:
                journal.failure("{} of {}".format(self.name, document.getURL()))

    def getImplementationName(self):
        return self.name

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return self.name, JOB


class Loaded(Job):
    name = TABLE.loaded
    work = staticmethod(enter_anew)


class Saved(Job):
    name = TABLE.saved
    work = staticmethod(put_plain_names)


def _excel_file(document):
    """Return the path of a document's file, nothing where it is not of the Excel kind."""
    url = document.getURL()
    is_excel = url.startswith("file:") and url.lower().endswith((".xlsx", ".xlsm", ".xltx", ".xltm"))
    return uno.fileUrlToSystemPath(url) if is_excel else ""


def _document(arguments):
    given = {argument.Name: argument.Value for argument in arguments}
    environment = {one.Name: one.Value for one in given.get("Environment", ())}
    return environment.get("Model")


g_ImplementationHelper = unohelper.ImplementationHelper()
for _job in Loaded, Saved:
    g_ImplementationHelper.addImplementation(_job, _job.name, (_job.name, JOB))
