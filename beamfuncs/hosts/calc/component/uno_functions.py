"""The add-in that the office calls: one method a function, made from the table of functions."""

import uno
import unohelper
from beamfuncs_component import answers, table
from beamfuncs_component.beamfuncs_client.client import Functions
from com.sun.star.lang import Locale, XServiceInfo, XServiceName
from com.sun.star.sheet import XAddIn

ADD_IN = "com.sun.star.sheet.AddIn"
TABLE = table.read()
FUNCTIONS, SERVICE = TABLE.functions, TABLE.service
SERVER = Functions(TABLE.version)


class Texts(XAddIn):
    """What the office asks of names and help, some of it in its own spelling."""

    def __init__(self):
        self.locale = Locale("en", "US", "")

    def setLocale(self, locale):
        self.locale = locale

    def getLocale(self):
        return self.locale

    def getProgrammaticFuntionName(self, shown):
        wanted = shown.lower()
        return next((method for method, known in FUNCTIONS.items() if known["name"] == wanted), "")

    def getDisplayFunctionName(self, method):
        return FUNCTIONS[method]["name"] if method in FUNCTIONS else method

    def getFunctionDescription(self, method):
        return FUNCTIONS[method]["summary"] if method in FUNCTIONS else ""

    def getDisplayArgumentName(self, method, index):
        return self._argument(method, index)[0]

    def getArgumentDescription(self, method, index):
        return self._argument(method, index)[1]

    def getProgrammaticCategoryName(self, method):
        return self.getDisplayCategoryName(method)

    def getDisplayCategoryName(self, method):
        return FUNCTIONS[method]["category"] if method in FUNCTIONS else ""

    def _argument(self, method, index):
        arguments = FUNCTIONS[method]["arguments"] if method in FUNCTIONS else []
        return arguments[index] if 0 <= index < len(arguments) else ("", "")


class AddIn(unohelper.Base, Texts, uno.getClass(TABLE.interface), XServiceName, XServiceInfo):
    """The service of the functions; their methods are added below."""

    def __init__(self, context):
        Texts.__init__(self)

    def getServiceName(self):
        return SERVICE

    def getImplementationName(self):
        return SERVICE

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return SERVICE, ADD_IN


def answering(known):
    """Return the method of a function."""
    answer = answers.rows if known["rows"] else answers.cell
    name = known["name"]
    if known["repeats"]:
        return lambda self, *arguments: answer(SERVER, name, (*arguments[:-1], *arguments[-1]))
    return lambda self, *arguments: answer(SERVER, name, arguments)


for _method, _known in FUNCTIONS.items():
    setattr(AddIn, _method, answering(_known))

g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(AddIn, SERVICE, (SERVICE, ADD_IN))
