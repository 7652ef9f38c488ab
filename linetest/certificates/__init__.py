"""Certificates: what the customer gets, made from the record only.

``words``    numbers as a reader expects them
``page``     the page around the content: policy, style, templates
``content``  what is said, checked against itself first
``render``   certificate and report as one self-contained HTML file, the same bytes every time
"""

from linetest.certificates.page import render_page
from linetest.certificates.render import certificate_file_name, render_certificate, render_report

__all__ = ["certificate_file_name", "render_certificate", "render_page", "render_report"]
