"""The UNO component of the add-in: texts for the Function Wizard, and a method for each function."""

import json
import os

import unohelper
from com.sun.star.lang import Locale, XServiceInfo, XServiceName
from com.sun.star.sheet import LocalizedName, XAddIn, XCompatibilityNames
from com.sun.star.task import XJob
from org.uffuncs.calc import XFunctions
from uffuncs_inside.binding import bind_names
from uffuncs_inside.running import Runner

with open(
    os.path.join(os.path.dirname(os.path.realpath(__file__)), "functions.json"), encoding="utf-8"
) as _file:
    CONTENT = json.load(_file)

SERVICE, JOB, CATEGORY = CONTENT["service"], CONTENT["job"], CONTENT["category"]
BY_METHOD = {f["method"]: f for f in CONTENT["functions"]}
METHOD_OF = {f["name"]: f["method"] for f in CONTENT["functions"]}
RUNNER = Runner({f["name"]: [a[0] for a in f["arguments"]] for f in CONTENT["functions"]})
ADD_IN = "com.sun.star.sheet.AddIn"
ENGLISH = Locale("en", "US", "")


class Functions(unohelper.Base, XFunctions, XAddIn, XCompatibilityNames, XServiceName, XServiceInfo):
    """The worksheet functions; their methods are added below."""

    def __init__(self, context):
        self.locale = ENGLISH

    def getProgrammaticFuntionName(self, name):  # the interface's own spelling
        return METHOD_OF.get(name, "")

    def getDisplayFunctionName(self, method):
        return BY_METHOD[method]["name"] if method in BY_METHOD else ""

    def getFunctionDescription(self, method):
        return BY_METHOD[method]["description"] if method in BY_METHOD else ""

    def getDisplayArgumentName(self, method, number):
        return self._argument(method, number)[0]

    def getArgumentDescription(self, method, number):
        return self._argument(method, number)[1]

    @staticmethod
    def _argument(method, number):
        arguments = BY_METHOD[method]["arguments"] if method in BY_METHOD else ()
        return arguments[number] if 0 <= number < len(arguments) else ("", "")

    def getProgrammaticCategoryName(self, method):
        return CATEGORY

    def getDisplayCategoryName(self, method):
        return CATEGORY

    def getCompatibilityNames(self, method):
        """The names in files of other programs: the same as in the cell."""
        if method not in BY_METHOD or not CONTENT["compatibility_names"]:
            return ()
        return (LocalizedName(ENGLISH, BY_METHOD[method]["name"]),)

    def setLocale(self, locale):
        self.locale = locale

    def getLocale(self):
        return self.locale

    def getServiceName(self):
        return SERVICE

    def getImplementationName(self):
        return SERVICE + ".implementation"

    def supportsService(self, name):
        return name in (SERVICE, ADD_IN)

    def getSupportedServiceNames(self):
        return (SERVICE, ADD_IN)


def _method(name):
    def call(self, *cells):
        return RUNNER.call(name, cells)

    return call


def _variadic_method(name):
    def call(self, *cells):
        return RUNNER.call(name, (*cells[:-1], *cells[-1]))

    return call


for _function in CONTENT["functions"]:
    _make = _variadic_method if _function["variadic"] else _method
    setattr(Functions, _function["method"], _make(_function["name"]))


class BindNames(unohelper.Base, XJob, XServiceInfo):
    """After a workbook is loaded: binds names that the program has read as unknown ones."""

    def __init__(self, context):
        pass

    def execute(self, arguments):
        try:
            environment = next((a.Value for a in arguments if a.Name == "Environment"), ())
            document = next((a.Value for a in environment if a.Name == "Model"), None)
            if document is not None and document.supportsService("com.sun.star.sheet.SpreadsheetDocument"):
                bind_names(document, METHOD_OF)
        except Exception:  # a workbook that cannot be changed stays as it was loaded
            pass

    def getImplementationName(self):
        return JOB + ".implementation"

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return (JOB, "com.sun.star.task.Job")


g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(Functions, SERVICE + ".implementation", (SERVICE, ADD_IN))
g_ImplementationHelper.addImplementation(BindNames, JOB + ".implementation", (JOB, "com.sun.star.task.Job"))
