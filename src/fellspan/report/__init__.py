"""Report: drawings and pages made from a StudyPlan.

Shows results and computes none. Templates, styles and scripts are files in this folder. A page holds everything inside
itself and makes no request.
"""
