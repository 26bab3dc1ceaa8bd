"""The style sheet for the few widgets that Qt paints itself."""

from wattproof.gui.theme import Theme

_SHEET = """
QWidget {{ color: {ink}; font-family: "{family}"; font-size: {body}px; }}
QMainWindow, QScrollArea, QScrollArea > QWidget > QWidget, QStackedWidget {{ background: {ground}; }}
QLabel {{ background: transparent; font-size: {body}px; }}
QLabel[kind="heading"] {{ font-size: {heading}px; font-weight: 600; }}
QLabel[kind="hint"] {{ font-weight: 600; font-size: {hint}px; padding-top: {pad}px; }}
QLabel[kind="remark"], QLabel[kind="foot"] {{ color: {soft}; font-size: {small}px; }}
QLabel[kind="caution"] {{ color: {ink}; font-size: {small}px; border-top: 1px solid {line}; padding-top: {pad}px; }}
QLabel[kind="notice"] {{
  background: {warn_paper}; border: 2px solid {warn}; border-radius: 6px; padding: {pad}px; font-size: {body}px;
}}
QLabel[kind="asked"] {{ font-weight: 600; font-size: {heading}px; }}
QLabel[kind="result"] {{ font-size: {hint}px; }}
QLabel[kind="sheet"] {{ font-size: {hint}px; }}
QLabel[kind="large"] {{ font-weight: 600; font-size: {large}px; }}
QLabel[kind="table"] {{ font-family: monospace; font-size: {small}px; }}
QFrame[kind="ask"] {{ background: {paper}; border: 2px solid {ink}; border-radius: 8px; }}
QLineEdit {{
  background: {paper}; border: 1px solid {ghost}; border-radius: 4px; padding: 3px 6px;
  font-size: {field}px; font-weight: 600;
}}
QLineEdit:focus {{ border: 2px solid {blue}; padding: 2px 5px; }}
QDoubleSpinBox {{ font-size: {field}px; font-weight: 600; }}
QScrollBar:vertical {{ background: transparent; width: 8px; }}
QScrollBar::handle:vertical {{ background: {ghost}; border-radius: 4px; min-height: 24px; }}
QScrollBar::add-line, QScrollBar::sub-line {{ height: 0; }}
QToolTip {{ background: {paper}; color: {ink}; border: 1px solid {ghost}; padding: 4px; }}
"""


def sheet(theme: Theme) -> str:
    """Return the style sheet for the palette and scale in force."""
    colors = theme.palette
    names = ("ink", "ground", "soft", "line", "warn", "warn_paper", "paper", "ghost", "blue")
    return _SHEET.format(
        **{name: getattr(colors, name) for name in names},
        family=theme.font(18).family(),
        body=max(13, round(theme.px(19))),
        small=max(12, round(theme.px(16.5))),
        field=max(14, round(theme.px(22))),
        hint=max(14, round(theme.px(21))),
        heading=max(15, round(theme.px(24))),
        large=max(18, round(theme.px(34))),
        pad=max(5, round(theme.px(9))),
    )
