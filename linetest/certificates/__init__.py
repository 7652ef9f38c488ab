"""Certificates: what the customer gets, made from the record only.

``render``  one self-contained HTML file, the same bytes every time
"""

from linetest.certificates.render import certificate_file_name, render_certificate, render_report

__all__ = ["certificate_file_name", "render_certificate", "render_report"]
