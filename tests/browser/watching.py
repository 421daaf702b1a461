"""What a page does besides showing itself."""

from collections.abc import Callable
from dataclasses import dataclass, field

from playwright.sync_api import Dialog, Page

#: ``show(name, width=..., dark=..., script=..., at=...)`` of the fixtures.
Open = Callable[..., Page]


@dataclass
class Watch:
    """Messages of the console, requests and dialogs of the pages that it is put on."""

    messages: list[str] = field(default_factory=list)
    requests: list[str] = field(default_factory=list)
    dialogs: list[str] = field(default_factory=list)

    def on(self, page: Page) -> None:
        page.on("console", lambda message: self.messages.append(message.text))
        page.on("pageerror", lambda error: self.messages.append(str(error)))
        page.on("request", lambda request: self.requests.append(request.url))
        page.on("dialog", self._dialog)

    def _dialog(self, dialog: Dialog) -> None:
        self.dialogs.append(dialog.message)
        dialog.dismiss()
